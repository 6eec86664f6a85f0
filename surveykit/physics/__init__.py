"""Physics of the survey: arrays in, arrays out; SI units inside, named in every argument."""
