"""Files: what may be read at all, and how it is told when it may not."""

from __future__ import annotations

import os
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sinkwright.definitions import loading
from sinkwright.errors import FileError

PLAN = '[[test]]\nkind = "rest"\nduration_s = 1.5\n'


def written(folder: Path, content: bytes) -> Path:
    path = folder / "mine.toml"
    path.write_bytes(content)
    return path


def refused(path: Path) -> FileError:
    with pytest.raises(FileError) as raised:
        loading.load_plan(path)
    assert raised.value.where.startswith(str(path))
    assert "\n" not in str(raised.value)
    return raised.value


def test_a_plan_is_named_after_its_file(tmp_path: Path) -> None:
    assert loading.load_plan(written(tmp_path, PLAN.encode())).name == "mine"


def test_windows_line_ends_and_a_byte_order_mark_are_harmless(tmp_path: Path) -> None:
    content = b"\xef\xbb\xbf" + PLAN.replace("\n", "\r\n").encode()
    assert loading.load_plan(written(tmp_path, content)).text == PLAN


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"\x7fELF\x02\x01\x01\x00\x00\xff\xfe\x80", "not text"),
        (b"\x89PNG\r\n\x1a\n\x00\x00\x00\rIHDR", "not text"),
        (b"a = 1\n\x00\n", "not text"),
        ('# Müller\n[[test]]\nkind = "rest"\n'.encode("latin-1"), "not UTF-8 (line 1)"),
        (PLAN.encode("utf-16"), "UTF-16"),
        (b"# x\n" * (1 << 19), "larger than 1 MiB"),
    ],
)
def test_what_is_no_text_file_of_ours_is_refused_in_words(tmp_path: Path, content: bytes, words: str) -> None:
    assert words in refused(written(tmp_path, content)).what


def test_a_missing_file_and_a_folder_are_told_apart(tmp_path: Path) -> None:
    assert "does not exist" in refused(tmp_path / "absent.toml").what
    assert "is not a file" in refused(tmp_path).what
    assert refused(tmp_path / "nul\0name.toml").remedy


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="this system has no named pipes")
def test_a_pipe_is_refused_rather_than_waited_for(tmp_path: Path) -> None:
    os.mkfifo(tmp_path / "pipe.toml")
    assert "is not a file" in refused(tmp_path / "pipe.toml").what


@pytest.mark.parametrize(
    ("text", "line", "advice"),
    [
        ("# a\nvoltage_V = 2,5\n", 2, "with a point"),
        ("current_A = 2 A\n", 1, "the unit stands in the key"),
        ("sense = remote\n", 1, "in quotes"),
        ('[source]\nname = "a"\nname = "b"\n', 3, "stand once"),
        ("[source]\n[source]\n", 2, "stand once"),
        ("[source\n", 1, "sinkwright template plan"),
        ("name = 'unclosed", 1, "sinkwright template plan"),
        ("hello\n", 1, "sinkwright template plan"),
        ("a = " + "9" * 5000, 1, "sinkwright template plan"),
    ],
)
def test_a_slip_in_toml_is_named_by_line_with_advice(
    tmp_path: Path, text: str, line: int, advice: str
) -> None:
    error = refused(written(tmp_path, text.encode()))
    assert error.where.endswith(f"mine.toml, line {line}")
    assert advice in error.remedy


@pytest.mark.parametrize(
    "text",
    [
        "a = " + "[" * 100_000,
        "a = " + "[" * 60 + "]" * 60,
        "[" + ".".join("a" * 1 for _ in range(5000)) + "]\nb = 1\n",
        "x = " + "{a = " * 200 + "1" + "}" * 200,
    ],
)
def test_deep_nesting_is_refused(tmp_path: Path, text: str) -> None:
    assert "nested too deeply" in refused(written(tmp_path, text.encode())).what


@given(st.binary(max_size=200))
def test_no_bytes_end_in_anything_but_our_error(content: bytes) -> None:
    parsers = (loading.parse_plan, loading.parse_board, loading.parse_source)
    for parse in parsers:
        with pytest.raises(FileError):
            parse(content.decode("utf-8", "replace"))


_VALUES = st.recursive(
    st.sampled_from(["1", "-1", "nan", "true", '"2 A"', "1979-05-27", "[]", "{}", "0.5", "1e308", '"rest"']),
    lambda inner: st.lists(inner, max_size=3).map(lambda items: "[" + ", ".join(items) + "]"),
    max_leaves=4,
)
_KEYS = st.sampled_from(
    ["kind", "test", "source", "limits", "accept", "duration_s", "points", "name", "text", "current_A", "ocv"]
)


@given(
    st.lists(st.tuples(_KEYS, _VALUES), max_size=6, unique_by=lambda pair: pair[0]),
    st.sampled_from(["", "[[test]]\n"]),
)
def test_no_mixture_of_known_keys_ends_in_anything_but_our_error(
    pairs: list[tuple[str, str]], start: str
) -> None:
    text = start + "".join(f"{key} = {value}\n" for key, value in pairs)
    for parse in (loading.parse_plan, loading.parse_board, loading.parse_source):
        try:
            parse(text)
        except FileError as error:
            assert "Expected `" not in str(error), "a message of the validator leaked through unexplained"
