"""Kernels and what keeps their start short."""

import subprocess
import sys

from surveykit.kernels import WARM_UP, Kernels


def test_papermill_still_validates_without_the_grammar_that_is_kept_out():
    """jsonschema then skips one optional format; a notebook that is none is refused all the same.

    https://nbformat.readthedocs.io, JSON Schema of format 4: a cell's `source` is text.
    """
    code = ("import sys, surveykit.runner, papermill, nbformat\n"
            "assert sys.modules['rfc3987_syntax'] is None\n"
            "good = nbformat.v4.new_notebook(cells=[nbformat.v4.new_code_cell('1')])\n"
            "nbformat.validate(good)\n"
            "bad = {'nbformat': 4, 'nbformat_minor': 5, 'metadata': {}, 'cells': [\n"
            "    {'cell_type': 'code', 'id': 'a', 'metadata': {}, 'source': 1}]}\n"
            "try:\n    nbformat.validate(bad)\n"
            "except nbformat.ValidationError as error:\n    print('refused')\n")
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout == "refused\n"


def test_the_help_imports_nothing_heavy():
    code = ("import sys\nfrom surveykit.cli import main\n"
            "try:\n    main(['--help'])\nexcept SystemExit:\n    pass\n"
            "print(sorted({'numpy', 'pandas', 'pydantic', 'papermill', 'matplotlib'} "
            "& set(sys.modules)))")
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.endswith("[]\n")


def test_kernels_are_fresh_ahead_and_all_ended(tmp_path):
    with Kernels(tmp_path, ahead=1) as kernels:
        first = kernels.take()
        second = kernels.take()
        assert first is not second
        assert first.has_kernel
        assert second.has_kernel
        first.end()
        assert not first.has_kernel
    assert not second.has_kernel


def test_the_imports_run_ahead_are_those_of_the_notebooks(pytestconfig):
    for path in (pytestconfig.rootpath / "notebooks").glob("0[1-4]_*.ipynb"):
        text = path.read_text(encoding="utf-8")
        for line in WARM_UP.splitlines()[:2]:
            assert line in text, path.name
