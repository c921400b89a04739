"""YAML to values with places: what is read, what is refused, and that both parsers say the same."""

from __future__ import annotations

import ast
import os
import pickle
import subprocess
import sys
from pathlib import Path

import pytest
import yaml
from hypothesis import given, settings
from hypothesis import strategies as st

from wavejob.problems import JobFileError, Place
from wavejob.reading import yaml_tree
from wavejob.reading.yaml_tree import Document, dotted, read_document, read_text

HAS_LIBYAML = hasattr(yaml, "CSafeLoader")


@pytest.fixture(params=[pytest.param("fast"), pytest.param("python")])
def _both_parsers(request: pytest.FixtureRequest, monkeypatch: pytest.MonkeyPatch) -> None:
    """Run the test with libyaml (where PyYAML has it) and with the Python parser."""
    if request.param == "python":
        monkeypatch.setattr(yaml_tree, "FAST_LOADER", None)


def _read(text: str) -> Document:
    return read_text(text, "a.yml")


def _mistakes(text: str) -> list[str]:
    with pytest.raises(JobFileError) as caught:
        _read(text)
    return [problem.headline() for problem in caught.value.problems]


def _file_mistake(path: Path) -> str:
    with pytest.raises(JobFileError) as caught:
        read_document(path, "a.yml")
    (problem,) = caught.value.problems
    return problem.headline()


# The core schema: YAML 1.2.2, section 10.3.2 (yaml.org/spec/1.2.2), whose examples these are in part.
@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("1e-3", 1e-3),
        ("1E5", 1e5),
        ("-1e-10", -1e-10),
        (".5", 0.5),
        ("5.", 5.0),
        ("+12e03", 12000.0),
        ("-2E+05", -200000.0),
        ("012", 12),
        ("0o14", 12),
        ("0xC", 12),
        ("-19", -19),
        ("on", "on"),
        ("off", "off"),
        ("yes", "yes"),
        ("no", "no"),
        ("y", "y"),
        ("true", True),
        ("False", False),
        ("~", None),
        ("null", None),
        ("1:30", "1:30"),
        ("12:30:45", "12:30:45"),
        ("2026-08-22", "2026-08-22"),
        ("1_000", "1_000"),
        ("0b11", "0b11"),
        ("=", "="),
        ("inf", "inf"),
        ("nan", "nan"),
        ("5 nm", "5 nm"),
        ("'1e-3'", "1e-3"),
        ('"true"', "true"),
        ("'<<'", "<<"),
        ("1,5", "1,5"),
    ],
)
@pytest.mark.usefixtures("_both_parsers")
def test_scalars(text: str, value: object) -> None:
    read = _read(f"a: {text}").value
    assert read == {"a": value}
    assert type(read["a"]) is type(value)  # 1 is True and 1.0 in Python


@pytest.mark.usefixtures("_both_parsers")
def test_places_of_values_and_keys() -> None:
    document = _read("a: 5 nm\nb:\n  - {c: 1, d: [x, é, z]}\n  - f:\n      gg: 2\nh:\n")
    assert document.value == {"a": "5 nm", "b": [{"c": 1, "d": ["x", "é", "z"]}, {"f": {"gg": 2}}], "h": None}
    assert document.places[("b", 0, "d", 2)] == Place("a.yml", 3, 22)  # columns count characters, not bytes
    assert document.places[("b", 0)] == Place("a.yml", 3, 5)
    assert document.key_places[("b", 1, "f", "gg")] == Place("a.yml", 5, 7)
    assert document.places[("b", 1, "f", "gg")] == Place("a.yml", 5, 11)
    assert document.place(("b", 1, "f", "missing", 3)) == Place("a.yml", 5, 7)
    assert document.source(document.place(("b", 1, "f"))) == "      gg: 2"
    assert document.source(Place("a.yml")) == ""
    assert document.places[("h",)] == document.key_places[("h",)] == Place("a.yml", 6, 1)
    assert set(document.places) == {
        (),
        *document.key_places,
        ("b", 0),
        ("b", 1),
        *[("b", 0, "d", i) for i in range(3)],
    }


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
@pytest.mark.usefixtures("_both_parsers")
def test_line_ends(end: str) -> None:
    document = _read(f"a: 1{end}b: 2{end}{end}# c{end}c: 3{end}")
    assert document.places[("c",)] == Place("a.yml", 5, 4)
    assert document.source(document.places[("c",)]) == "c: 3"


def test_a_path_as_it_is_shown() -> None:
    assert dotted(("potential", 1, "barrier", "height")) == "potential[1].barrier.height"
    assert dotted((0, "a")) == "[0].a"
    assert dotted(()) == ""


@pytest.mark.usefixtures("_both_parsers")
def test_all_mistakes_in_one_go() -> None:
    text = """\
a: 1
a: 2
b: &x 3
c: *x
<<: {a: 1}
1: 3
d: .inf
e: !!str 3
? [a]
: 3
f: {g: 1, g: {h: 1, h: 2}}
i: 1e999
~: 1
true: 1
j: !x {k: -.INF}
l: "\\a"
"""
    assert _mistakes(text) == [
        "a.yml:2:1: a: the key `a` was given before, on line 1; keep one of the two",
        "a.yml:3:4: b: anchors (`&x`) are not read; leave the anchor out",
        "a.yml:4:4: c: aliases (`*x`) are not read; write the value out, or use `based_on`",
        "a.yml:5:1: merge keys (`<<`) are not read; write the keys out, or use `based_on`",
        "a.yml:6:1: the key `1` is not text; use a name, or put it in quotes",
        "a.yml:7:4: d: `.inf` is not a finite number; write a finite number",
        "a.yml:8:4: e: tags (`!!str`) are not read; leave the tag out, or put the text in quotes",
        "a.yml:9:3: a list or map can't be a key; write a name before the colon, and text that begins with "
        "`{` or `[` in quotes",
        "a.yml:11:11: f.g: the key `g` was given before, on line 11; keep one of the two",
        "a.yml:11:21: the key `h` was given before, on line 11; keep one of the two",
        "a.yml:12:4: i: the number `1e999` is out of range; write a smaller one",
        "a.yml:13:1: a key is missing before the colon; write a name there",
        "a.yml:14:1: the key `true` is not text; use a name, or put it in quotes",
        "a.yml:15:4: j: tags (`!x`) are not read; leave the tag out, or put the text in quotes",
        "a.yml:15:11: j.k: `-.INF` is not a finite number; write a finite number",
        "a.yml:16:4: l: an escape stands for the character U+0007; leave it out",
    ]


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("a:\n\tb: 1", "2:1: a tab is used for indentation"),
        ("{a: 1,\n\tb: 2}", "2:1: a tab is used for indentation"),
        ("a: b: c", "1:5: a second `: ` on one line, or a line that is indented too far"),
        ("a: 1\n b: 2", "2:3: a second `: ` on one line, or a line that is indented too far"),
        ("a: 1\nfoo\nb: 2", "3:1: this line is neither `key: value` nor `- item`"),
        ("a: - b", "1:4: a list item `- ` may not begin here"),
        ("- a\nb: 1", "2:1: this line does not belong to the block above it"),
        ("a: [1, 2", "1:9: a list in `[ ]` is not closed, or lacks a comma"),
        ("a: {b: 1", "1:9: a map in `{ }` is not closed, or lacks a comma"),
        ("a: 'b", "1:6: a quoted text is not closed"),
        ('a: "\\q"', "1:6: a backslash in a text in double quotes begins no known escape"),
        ('a: "\\xg"', "1:7: an escape in double quotes lacks its hexadecimal digits"),
        ('a: "\\UFFFFFFFF"', "1:7: the text is not well-formed YAML from here on"),
        ("a: @b", "1:4: a value may not begin with this sign"),
        ("a: `b`", "1:4: a value may not begin with this sign"),
        ("a: ]", "1:4: a value is missing here"),
        ("a: |x\n b", "1:5: the sign after `|` or `>` is not known"),
        ("a: !b!c 1", "1:4: tags (`!name`) are not read"),
        ("%YAML 1.1\n---\na: 1", "1:1: `%` directives are not read"),
        ("%TAG !a! b\n---\na: 1", "1:1: `%` directives are not read"),
        ("a: 1\n---\nb: 2", "2:1: a second document begins here"),
        ("a: 1\n...\nb", "3:1: something stands after the end of the content"),
        ("&a a: 1", "1:1: anchors (`&a`) are not read"),
        ("{{b2}}", "1:2: a list or map can't be a key"),
        ("a: " + "9" * 5000, f"1:4: a: the number `{'9' * 37}...` is out of range"),
        ("a: 0x" + "f" * 5000, f"1:4: a: the number `0x{'f' * 35}...` is out of range"),
        ('a: "\\ud800"', "1:4: a: an escape stands for the character U+D800"),
        ("a: \x07", "1:4: the unseen character U+0007 stands here"),
        ("a: 1\nb: \u2028c", "2:4: the unseen character U+2028 stands here"),
    ],
)  # fmt: skip
@pytest.mark.usefixtures("_both_parsers")
def test_one_mistake_in_our_own_words(text: str, said: str) -> None:
    (mistake,) = _mistakes(text)
    assert mistake.startswith(f"a.yml:{said}; ")


@pytest.mark.parametrize("text", ["", "\n\n", "# only a comment\n", "---\n", "~"])
@pytest.mark.usefixtures("_both_parsers")
def test_empty(text: str) -> None:
    assert _mistakes(text) == ["a.yml: the file is empty; write a job in it"]


@pytest.mark.parametrize("text", ["[" * 100_000, "{a: " * 100_000, "- " * 100_000, "? " * 100_000])
@pytest.mark.usefixtures("_both_parsers")
def test_deep_nesting(text: str) -> None:
    assert _mistakes(text)[0].endswith("values are nested more than 50 deep; close the brackets earlier")


@pytest.mark.usefixtures("_both_parsers")
def test_the_allowed_depth_is_read() -> None:
    assert _read("[" * 51 + "]" * 51).value == ast.literal_eval("[" * 51 + "]" * 51)


@pytest.mark.usefixtures("_both_parsers")
def test_too_many_values() -> None:
    limit = yaml_tree.MAX_NODES
    assert len(_read("[" + "a, " * (limit - 1) + "]").value) == limit - 1  # type: ignore[arg-type]
    assert "more than 20000 values" in _mistakes("[" + "a, " * limit + "]")[0]


def test_directive_of_version_1_2_is_harmless() -> None:
    assert _read("%YAML 1.2\n---\na: 1").value == {"a": 1}


def test_the_offending_line_stands_below() -> None:
    with pytest.raises(JobFileError) as caught:
        _read("a: 1\nb: .nan\n")
    assert str(caught.value).splitlines()[1:] == ["    b: .nan", "       ^"]
    assert str(pickle.loads(pickle.dumps(caught.value))) == str(caught.value)


def test_a_file_with_a_byte_order_mark(tmp_path: Path) -> None:
    (tmp_path / "a.yml").write_bytes("\ufeffa: 1\nb: é\n".encode())
    document = read_document(tmp_path / "a.yml")
    assert document.value == {"a": 1, "b": "é"}
    assert document.key_places[("a",)] == Place(str(tmp_path / "a.yml"), 1, 1)


@pytest.mark.parametrize(
    ("data", "said"),
    [
        (b"a: 1\nb: caf\xe9\n", "a.yml:2:7: the byte 0xe9 is not UTF-8 text; save the file as UTF-8"),
        ("\ufeffé".encode() + b"\xff", "a.yml:1:2: the byte 0xff is not UTF-8 text; save the file as UTF-8"),
        ("a: 1".encode("utf-16"), "a.yml: the file is UTF-16 text; save it as UTF-8"),
        (b"a: 1\n\x00\x01", "a.yml:2:1: the file holds a NUL byte, so it is no text file; name a text file"),
        (b"#" * (1 << 20) + b"\n", "a.yml: the file is larger than 1 MiB; keep data in files of their own, "
         "and name those in the job"),
    ],
)  # fmt: skip
def test_files_that_are_no_text(tmp_path: Path, data: bytes, said: str) -> None:
    (tmp_path / "b").write_bytes(data)
    assert _file_mistake(tmp_path / "b") == said


def test_files_that_cannot_be_opened(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("a: 1")
    missing = "a.yml: there is no such file; check the path"
    assert _file_mistake(tmp_path / "none") == missing
    assert _file_mistake(tmp_path / "file" / "below") == missing
    assert _file_mistake(tmp_path / "nul\0") == missing
    assert _file_mistake(tmp_path) == "a.yml: this is a folder, not a file; name a file in it"
    assert _file_mistake(tmp_path / ("x" * 5000)).startswith("a.yml: the file can't be read (")


@pytest.mark.skipif(sys.platform == "win32", reason="no named pipes in the file system there")
def test_a_pipe_is_not_waited_for(tmp_path: Path) -> None:
    os.mkfifo(tmp_path / "pipe")
    assert _file_mistake(tmp_path / "pipe") == "a.yml: this is not an ordinary file; name a file on disk"


def test_a_file_that_may_not_be_read(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(*_: object) -> None:
        raise PermissionError

    (tmp_path / "a").write_text("a: 1")
    monkeypatch.setattr(Path, "open", refuse)  # root may read whatever the mode says
    assert _file_mistake(tmp_path / "a") == "a.yml: the file may not be read; change its permissions"


def test_other_readers_of_yaml_in_the_process_are_left_alone() -> None:
    code = "import yaml; import wavejob.reading.yaml_tree; print(yaml.safe_load('[1e-3, on, 017]'))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True, cwd=Path.cwd())
    assert done.stdout == "['1e-3', True, 15]\n"


_PIECES = st.sampled_from(
    ["a", "b", ": ", ":", "- ", "-", "\n", "\n  ", "\n    ", "[", "]", "{", "}", ", ", "'", '"', "#", " #",
     "? a\n: b\n", "&x ", "*x", "!t ", "|\n  ", ">\n", "1", "1e-3", "~", "<<", "é", "\\", "%", "@",
     "---\n", "...\n",
     "\t", " ", "\r\n", "=", "\U0001f600"]
)  # fmt: skip


def _outcome(text: str) -> tuple[object, ...]:
    try:
        document = _read(text)
    except JobFileError as error:
        return (str(error),)
    return (document.value, document.places, document.key_places)


@pytest.mark.skipif(not HAS_LIBYAML, reason="PyYAML was built without libyaml, so there is one parser only")
@settings(max_examples=400, deadline=None)
@given(text=st.lists(_PIECES, max_size=25).map("".join))
def test_both_parsers_agree_and_nothing_else_is_raised(text: str) -> None:
    fast = _outcome(text)
    loader, yaml_tree.FAST_LOADER = yaml_tree.FAST_LOADER, None
    try:
        plain = _outcome(text)
    finally:
        yaml_tree.FAST_LOADER = loader
    assert fast == plain


@settings(max_examples=300, deadline=None)
@given(text=st.text(max_size=60))
def test_any_text_is_read_or_refused(text: str) -> None:
    _outcome(text)
