"""YAML is read the same by every route: strict reading, its limits, and what it refuses.

The two readings compared are PyYAML's SafeLoader (YAML 1.1, the one the notebooks' runner uses) and
the core schema of YAML 1.2.2, section 10.3.2, written down here a second time from its table.
"""

from __future__ import annotations

import math
import re

import pytest
import yaml
from hypothesis import assume, example, given
from hypothesis import strategies as st

from surveykit.core import InputError
from surveykit.intake.params import is_kit, is_kit_file, load, read_plain
from surveykit.intake.params.reading import MAX_ALIASES, MAX_BYTES, MAX_DEPTH, read_document
from surveykit.intake.params.scalars import number_text, plain_reading

# plain scalar: (what the sentence says, the spelling that then loads)
AMBIGUOUS = {
    "no": ("false or as text; write false", '"no"'), "on": ("true or as text", '"on"'),
    "Yes": ("true or as text; write true", '"Yes"'), "off": ("false or as text", '"off"'),
    "y": ("for yes or no", '"y"'), "N": ("for yes or no", '"N"'),
    "12:30": ("YAML reads a bare 12:30 as 750; write \"12:30\", in quotes", '"12:30"'),
    "12:30:05": ("as 45005; write", '"12:30:05"'), "190:20:30.15": ("write", '"190:20:30.15"'),
    "0120": ("as 80 or as 120; write 120", "120"), "09": ("as text or as 9; write 9", "9"),
    "0o17": ("as text or as 15; write 15", "15"), "1e-3": ("or as 0.001; write 0.001", "0.001"),
    "2e4": ("write 20000", "20000"), "1_000": ("as 1000 or as text; write 1000", "1000"),
    "0b101": ("as 5 or as text; write 5", "5"), "-0x1F": ("as -31 or as text; write -31", "-31"),
    "+.5e3": ("write 500", "500"), "1.5_0": ("as 1.5 or as text; write 1.5", "1.5"),
    "1.0e10": ("write 10000000000", "10000000000"), "685.230_15e+03": ("write 685230.15", "685230"),
    "2025-07-24": ('as a date in some readers; write "2025-07-24", in quotes', '"2025-07-24"'),
    "2025-07-24T10:00:00Z": ("as a date", '"2025-07-24T10:00:00Z"'),
    "2025-02-30": ("as a date", '"2025-02-30"'), "=": ("a meaning of its own", '"="'),
    "9" * 61: ("a number of 61 characters", "9"),
}


def read(tmp_path, text):
    path = tmp_path / "x.yml"
    path.write_bytes(text.encode("utf-8", "surrogatepass"))
    return read_plain(path, tmp_path)


def sentences(tmp_path, text):
    with pytest.raises(InputError) as caught:
        read(tmp_path, text)
    return caught.value.faults


@pytest.mark.parametrize("text", AMBIGUOUS)
def test_scalar_that_editions_read_differently_is_refused_and_its_spelling_loads(tmp_path, text):
    said, spelling = AMBIGUOUS[text]
    [sentence] = sentences(tmp_path, f"a: 1\nb: [1, {text}]\n")
    assert sentence.startswith("x.yml line 2: b[1]: got ")
    assert said in sentence
    data = read(tmp_path, f"a: 1\nb: [1, {spelling}]\n")
    assert data["b"][1] == yaml.safe_load(spelling)


@pytest.mark.parametrize("key", ["no", "1", "~", "12:30", "2025-07-24", "true", "1.5", "="])
def test_key_that_is_no_text_is_refused_and_quoted_it_loads(tmp_path, key):
    [sentence] = sentences(tmp_path, f"a: 1\n{key}: 2\n")
    assert sentence.startswith("x.yml line 2: ")
    assert f'as a key, a bare {key} is no text to every YAML reader; write "{key}", in quotes' \
        in sentence
    assert read(tmp_path, f'a: 1\n"{key}": 2\n') == {"a": 1, key: 2}


# id: (refused text, piece of the sentence, mended text)
STRUCTURE = {
    "duplicate key": ("a: {b: 1, c: 2}\nd: {b: 1,\n  b: 2}\n",
                      "line 2: d.b: written again in line 3; each key may stand once",
                      "a: {b: 1, c: 2}\nd: {b: 1}\n"),
    "duplicate in quotes": ('a: 1\n"a": 2\n', "line 1: a: written again in line 2", "a: 1\n"),
    "tag": ("a: !!str 12\n", "tag !!str in line 1; write the value without a tag", 'a: "12"\n'),
    "own tag": ("a: !thing {b: 1}\n", "tag !thing in line 1", "a: {b: 1}\n"),
    "object": ("a: !!python/object/apply:os.getcwd []\n", "tag !!python/object/apply:os.getcw",
               "a: []\n"),
    "merge": ("a: &x {b: 1}\nc: {<<: *x}\n", "line 2: c.'<<': merging is not supported",
              "a: &x {b: 1}\nc: *x\n"),
    "complex key": ("a: 1\n? [b, c]\n: 1\n", "a list or mapping as a key in line 2",
                    "a: 1\n"),
    "alias in itself": ("a: &x [*x]\n", "line 1: *x stands inside what it names", "a: &x [1]\n"),
    "alias of nothing": ("a: *x\n", "line 1: not YAML: found undefined alias", "a: &x 1\n"),
    "many aliases": ("a: &x 1\nb: [" + ", ".join(["*x"] * (MAX_ALIASES + 1)) + "]\n",
                     f"line 2: more than {MAX_ALIASES} aliases; write the values out",
                     "a: &x 1\nb: [" + ", ".join(["*x"] * MAX_ALIASES) + "]\n"),
    "deep": ("a: " + "[" * MAX_DEPTH + "]" * MAX_DEPTH, f"line 1: more than {MAX_DEPTH} levels",
             "a: " + "[" * (MAX_DEPTH - 1) + "]" * (MAX_DEPTH - 1)),
    "second document": ("a: 1\n---\nb: 2\n", "line 2: a second document begins", "---\na: 1\n"),
    "tab": ("a:\n\tb: 1\n", "line 2: not YAML:", "a:\n  b: 1\n"),
    "per cent": ("a: 1\nunit: %\n", "line 2: not YAML: ", 'a: 1\nunit: "%"\n'),
    "open bracket": ("a: [1, 2\nb: 3\n", "x.yml line 2: not YAML:", "a: [1, 2]\nb: 3\n"),
    "colon": ("a: b: c\n", "line 1: not YAML: mapping values are not allowed", 'a: "b: c"\n'),
    "no character": ('a: "\\UFFFFFFFF"\n', "an escape or directive holds no character",
                     'a: "\\u00e9"\n'),
    "control": ("a: \x07\n", "character 7 at position 3 is not allowed", "a: 7\n"),
    "list": ("- a\n", "x.yml: holds a list; write keys", "a: 1\n"),
    "text": ("hello\n", "x.yml: holds one text; write keys", "hello:\n"),
    "empty": ("", "x.yml: is empty; write the keys", "a:\n"),
    "comments": ("# nothing\n\n", "x.yml: is empty", "# nothing\na: 1\n"),
}


@pytest.mark.parametrize("case", STRUCTURE)
def test_structure_is_refused_and_mended_it_loads(tmp_path, case):
    bad, piece, good = STRUCTURE[case]
    [sentence] = sentences(tmp_path, bad)
    assert sentence.startswith("x.yml")
    assert piece in sentence
    assert read(tmp_path, good) == yaml.safe_load(good)


def test_alias_bomb_and_endless_file_stop_early(tmp_path):
    bomb = "a: &a [1, 1, 1, 1, 1, 1, 1, 1]\n" + "".join(
        f"{name}: &{name} [{', '.join([f'*{before}'] * 8)}]\n"
        for before, name in zip("abcdefgh", "bcdefghi", strict=True))
    assert "aliases" in sentences(tmp_path, bomb)[0]
    [sentence] = sentences(tmp_path, "a: [" + "1," * 30_000 + "1]\n")
    assert "more than 20000 entries" in sentence
    (tmp_path / "x.yml").write_text("a: " + "x" * MAX_BYTES)
    with pytest.raises(InputError, match=f"a parameter file has at most {MAX_BYTES}"):
        read_plain(tmp_path / "x.yml", tmp_path)


@pytest.mark.parametrize(("raw", "piece"), [
    (b"\xff\xfea\x00:\x00", "line 1: byte 0xff is not UTF-8; save the file as text in UTF-8"),
    ("a: 1\nb: é\n".encode("cp1252"), "line 2: byte 0xe9 is not UTF-8"),
    (b"PK\x03\x04\x00\x00", "is a binary file"),
])
def test_bytes_that_are_no_utf8_text(project, raw, piece):
    project.path.write_bytes(raw)
    with pytest.raises(InputError, match=re.escape(piece)):
        load(project.path)
    project.path.write_bytes(b"\xef\xbb\xbf" + project.write().read_bytes())
    assert load(project.path).name == "mill-yard-2025-07-24"  # a byte order mark is no harm


@pytest.mark.parametrize(("name", "piece"), [
    ("params", "params: is a folder; name a parameter file"),
    ("params/none.yml", "params/none.yml: no such file"),
    ("nowhere/none.yml", "nowhere/none.yml: no such file"),
    ("params/" + "x" * 300, "x"), ("params/a\0b.yml", r"a\x00b.yml'"),
])
def test_what_is_no_file(project, name, piece):
    with pytest.raises(InputError) as caught:
        load(project.root / name)
    assert len(caught.value.faults) == 1
    assert piece in caught.value.faults[0]


def test_missing_file_is_told_before_the_missing_project(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    with pytest.raises(InputError, match=r"none\.yml: no such file"):
        load("none.yml")
    (tmp_path / "some.yml").write_text("a: 1\n")
    with pytest.raises(InputError, match=r"no project folder: .* holds params/ and notebooks/"):
        load("some.yml")


def test_unreadable_loop_and_pipe(project):
    import os

    loop = project.root / "params" / "loop.yml"
    loop.symlink_to(loop)
    pipe = project.root / "params" / "pipe.yml"
    os.mkfifo(pipe)
    for path in (loop, pipe):
        with pytest.raises(InputError):
            load(path)


def test_kit_is_recognised(project):
    assert is_kit_file(project.kit)
    assert not is_kit_file(project.path)
    assert not is_kit_file(project.root / "none.yml")
    assert not is_kit({})
    assert not is_kit({"a": {"b": 1}})
    with pytest.raises(InputError, match="is a kit of instruments, not a campaign"):
        load(project.kit)


# --- the two readings agree, or the scalar is refused --------------------------------------------

CORE = [  # YAML 1.2.2, section 10.3.2
    (r"(null|Null|NULL|~)?", lambda t: None),
    (r"true|True|TRUE", lambda t: True), (r"false|False|FALSE", lambda t: False),
    (r"[-+]?[0-9]+", int), (r"0o[0-7]+", lambda t: int(t[2:], 8)),
    (r"0x[0-9a-fA-F]+", lambda t: int(t[2:], 16)),
    (r"[-+]?(\.[0-9]+|[0-9]+(\.[0-9]*)?)([eE][-+]?[0-9]+)?", float),
    (r"[-+]?\.(inf|Inf|INF)", lambda t: -math.inf if t.startswith("-") else math.inf),
    (r"\.(nan|NaN|NAN)", lambda t: math.nan),
]


def core(text):
    for pattern, convert in CORE:
        if re.fullmatch(pattern, text):
            return convert(text)
    return text


def same(a, b):
    return type(a) is type(b) and (a == b or (a != a and b != b))


numberish = st.text("0123456789+-._:eExob~", min_size=1, max_size=10)
words = st.sampled_from("yes No ON off y N true False null ~ = << .inf .NaN Infinity nan".split())
anything = st.text(st.characters(exclude_categories=("Cs", "Cc")), min_size=1, max_size=12)


@given(st.one_of(numberish, words, anything, st.floats().map(repr), st.integers().map(str),
                 st.dates().map(str), st.times().map(str), st.datetimes().map(str)))
@example("0o17")
@example("1e3")
@example("0x_1")
@example("-.")
@example("0b")
@example("+12:30")
def test_plain_scalar_loads_equal_under_both_editions_or_is_refused(tmp_path_factory, text):
    path = tmp_path_factory.getbasetemp() / "scalar.yml"
    path.write_text(f"a: {text}\n", encoding="utf-8", newline="")
    try:
        data = read_document(path, "scalar.yml")
    except InputError:
        return
    if data.faults:
        return
    node = yaml.compose(f"a: {text}\n")
    scalar = node.value[0][1]
    assume(isinstance(scalar, yaml.ScalarNode) and scalar.style is None)
    old = yaml.safe_load(f"a: {text}\n")["a"]
    assert same(data.data["a"], old)
    assert same(old, core(scalar.value))


@given(st.one_of(st.floats(), st.integers(-10**12, 10**12)))
def test_number_as_we_tell_to_write_it_is_read_back_by_both(value):
    text = number_text(value)
    assume(text != "nan")
    assert yaml.safe_load(text) == value
    assert core(text) == value
    assert plain_reading(text) == (value, None)


@given(anything)
def test_quoted_text_is_never_refused(tmp_path_factory, text):
    path = tmp_path_factory.getbasetemp() / "quoted.yml"
    path.write_text(yaml.safe_dump({"a": text}, default_style='"', allow_unicode=False))
    assert read_plain(path) == {"a": text}
