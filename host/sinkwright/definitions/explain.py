"""Finds the first mistake in a file's values and says which key it is, what is wrong and what would be right.

msgspec decides whether the values are right; this module only explains, by walking values and declared types
side by side. Keys are named as people count: the second `[[test]]` is `test[2]`. Knows no particular
kind of file.
"""

from __future__ import annotations

import difflib
import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any

import msgspec
import msgspec.inspect as mi

from .keys import KeyMistake


@dataclass(frozen=True)
class Mistake:
    """`key` as people count, "" for the file as a whole."""

    key: str
    what: str
    right: str


def first_mistake(data: Any, root: mi.Type, later: tuple[str, ...] = ()) -> Mistake | None:
    """The first mistake in file order, or None. `later` are kinds that a later version will know."""
    return next(_Walk(root, later).mistakes(data, root, "", {}), None)


def join(path: str, key: str) -> str:
    """`key` relative to `path`; an index sticks to what it indexes."""
    if not path or not key:
        return path or key
    return path + key if key.startswith("[") else f"{path}.{key}"


def shown(value: Any) -> str:
    """A value as it may stand in a sentence: TOML's spelling, cut short."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, dict):
        return "a table"
    if isinstance(value, list):
        return "a list"
    text = f'"{value}"' if isinstance(value, str) else str(value)
    return text if len(text) <= 40 else text[:37] + "..."


def visible_fields(struct: mi.StructType) -> dict[str, mi.Field]:
    """The keys that a person may write, by name."""
    return {f.encode_name: f for f in struct.fields if not facts(f.type).get("by_program")}


def facts(declared: mi.Type) -> Mapping[str, Any]:
    """What `keys.quantity` and its kin have noted beside a type."""
    if isinstance(declared, mi.Metadata):
        return {**facts(declared.type), **(declared.extra_json_schema or {})}
    if isinstance(declared, mi.UnionType):
        return next((found for part in declared.types if (found := facts(part))), {})
    return {}


def bare(declared: mi.Type) -> mi.Type:
    """The type itself, without notes and without `| None` (which TOML cannot write)."""
    if isinstance(declared, mi.Metadata):
        return bare(declared.type)
    if isinstance(declared, mi.UnionType):
        rest = [part for part in declared.types if not isinstance(part, mi.NoneType)]
        return bare(rest[0]) if len(rest) == 1 else declared
    return declared


def kinds_of(declared: mi.Type) -> dict[str, mi.StructType]:
    """The structs of a tagged union, by tag."""
    union = bare(declared)
    parts = union.types if isinstance(union, mi.UnionType) else ()
    return {str(part.tag): part for part in parts if isinstance(part, mi.StructType)}


class _Walk:
    def __init__(self, root: mi.Type, later: tuple[str, ...]) -> None:
        self._root = root
        self._later = later

    def mistakes(
        self, value: Any, declared: mi.Type, path: str, noted: Mapping[str, Any]
    ) -> Iterator[Mistake]:
        noted = {**noted, **facts(declared)}
        declared = bare(declared)
        if isinstance(declared, mi.UnionType):
            yield from self._tagged(value, declared, path)
        elif isinstance(declared, mi.StructType):
            yield from self._struct(value, declared, path)
        elif isinstance(declared, mi.DictType):
            yield from self._mapping(value, declared, path)
        elif isinstance(declared, mi.VarTupleType):
            yield from self._list(value, declared, path)
        elif isinstance(declared, mi.TupleType):
            yield from self._pair(value, declared, path)
        elif isinstance(declared, (mi.FloatType, mi.IntType)):
            yield from _number(value, declared, path, noted)
        elif isinstance(declared, mi.StrType):
            yield from _text(value, declared, path)
        elif isinstance(declared, mi.BoolType):
            if not isinstance(value, bool):
                yield Mistake(path, f"is {shown(value)}, where a switch belongs", "write true or false")
        elif isinstance(declared, mi.LiteralType):
            yield from _choice(value, tuple(map(str, declared.values)), path)

    def _tagged(self, value: Any, declared: mi.UnionType, path: str) -> Iterator[Mistake]:
        kinds = kinds_of(declared)
        if not isinstance(value, dict):
            yield Mistake(path, f"is {shown(value)}, where a table belongs", "write a table with a kind")
            return
        key = join(path, "kind")
        if "kind" not in value:
            close = difflib.get_close_matches("kind", value, n=1, cutoff=0.7)
            meant = f" (is {close[0]} meant to be it?)" if close else ""
            yield Mistake(key, f"is missing{meant}", f"write kind = one of {_listed(kinds)}")
        elif value["kind"] in self._later:
            yield Mistake(
                key,
                f"{shown(value['kind'])} belongs to a later version",
                f"this version carries out {_listed(kinds)}",
            )
        elif value["kind"] not in kinds if isinstance(value["kind"], str) else True:
            yield from _choice(value["kind"], (*kinds, *self._later), key, offered=tuple(kinds))
        else:
            yield from self._struct(value, kinds[value["kind"]], path)

    def _struct(self, value: Any, declared: mi.StructType, path: str) -> Iterator[Mistake]:
        if not isinstance(value, dict):
            yield Mistake(path, f"is {shown(value)}, where a table belongs", _table_meant(path, declared))
            return
        fields = visible_fields(declared)
        for key, item in value.items():
            if key in fields:
                yield from self.mistakes(item, fields[key].type, join(path, key), {})
            elif key != declared.tag_field:
                yield Mistake(join(path, _quoted(key)), "is no key here", self._meant(key, fields, declared))
        for key, field in fields.items():
            if field.required and key not in value:
                yield Mistake(join(path, key), "is missing", _line_meant(key, field))
        yield from _own_check(value, declared, path)

    def _meant(self, key: str, fields: Mapping[str, mi.Field], declared: mi.StructType) -> str:
        if close := _closest(key, list(fields)):
            return f"did you mean {close}?"
        for table, inner in _tables(self._root):
            if inner.cls is not declared.cls and key in visible_fields(inner):
                return f"it belongs under [{table}]"
        return f"the keys here are {_listed(fields)}"

    def _mapping(self, value: Any, declared: mi.DictType, path: str) -> Iterator[Mistake]:
        if not isinstance(value, dict):
            yield Mistake(
                path, f"is {shown(value)}, where a table belongs", "write name = { max = 1.0 } below it"
            )
            return
        for key, item in value.items():
            yield from self.mistakes(item, declared.value_type, join(path, _quoted(key)), {})

    def _list(self, value: Any, declared: mi.VarTupleType, path: str) -> Iterator[Mistake]:
        if isinstance(value, dict):
            yield Mistake(
                path, "is one table, where a list of tables belongs", f"write [[{path}]], in double brackets"
            )
        elif not isinstance(value, list):
            right = (
                f"write [[{path}]], in double brackets"
                if kinds_of(declared.item_type)
                else "write [[1, 2], [3, 4]]"
            )
            yield Mistake(path, f"is {shown(value)}, where a list belongs", right)
        elif len(value) < (declared.min_length or 0):
            yield Mistake(path, "is empty", f"give at least {declared.min_length}")
        else:
            for number, item in enumerate(value, start=1):
                yield from self.mistakes(item, declared.item_type, f"{path}[{number}]", {})

    def _pair(self, value: Any, declared: mi.TupleType, path: str) -> Iterator[Mistake]:
        if not isinstance(value, list) or len(value) != len(declared.item_types):
            count = f"{len(value)} value(s)" if isinstance(value, list) else shown(value)
            yield Mistake(path, f"is {count}, where two numbers belong", "write [number, number]")
            return
        for number, (item, kind) in enumerate(zip(value, declared.item_types, strict=True), start=1):
            yield from self.mistakes(item, kind, f"{path}[{number}]", {})


def _table_meant(path: str, declared: mi.StructType) -> str:
    if "[" not in path:
        return f"write [{path}], and its keys in the lines below"
    keys = ", ".join(f"{key} = ..." for key in list(visible_fields(declared))[:3])
    return f"write {path.rpartition('.')[2]} = {{ {keys} }}"


def _line_meant(key: str, field: mi.Field) -> str:
    noted = facts(field.type)
    about = str(noted.get("description", ""))
    about = about[:1].lower() + about[1:]
    declared = bare(field.type)
    if isinstance(declared, mi.StructType):
        return f"add a table [{key}]: {about}"
    if isinstance(declared, mi.VarTupleType) and kinds_of(declared.item_type):
        return f"add a table [[{key}]]: {about}"
    unit = f" with a number in {noted['unit']}" if noted.get("unit") else ""
    return f"add `{key} = ...`{unit}: {about}"


def _own_check(value: dict[str, Any], declared: mi.StructType, path: str) -> Iterator[Mistake]:
    """What the struct's own check says of values that are right one by one."""
    try:
        msgspec.convert(value, declared.cls)
    except msgspec.ValidationError as error:
        if isinstance(error.__cause__, KeyMistake):
            cause = error.__cause__
            yield Mistake(join(path, cause.key), cause.what, cause.right)


def _number(
    value: Any, declared: mi.FloatType | mi.IntType, path: str, noted: Mapping[str, Any]
) -> Iterator[Mistake]:
    unit = str(noted.get("unit", ""))
    whole = isinstance(declared, mi.IntType)
    if isinstance(value, str):
        yield Mistake(path, f"is the text {shown(value)}, where a number belongs", _number_meant(value, unit))
    elif isinstance(value, bool) or not isinstance(value, (int, float)):
        in_unit = f" ({unit})" if unit else ""
        yield Mistake(
            path, f"is {shown(value)}, where a number{in_unit} belongs", "write a number without quotes"
        )
    elif whole and not isinstance(value, int):
        yield Mistake(
            path, f"is {shown(value)}, where a whole number belongs", f"write {round(value)}, without a point"
        )
    else:
        yield from _within(value, declared, path, unit)


def _within(value: float, declared: mi.FloatType | mi.IntType, path: str, unit: str) -> Iterator[Mistake]:
    suffix = f" {unit}" if unit not in ("", "1", "as the name") else ""
    tests = (
        ("above", declared.gt, lambda bound: value > bound),
        ("at least", declared.ge, lambda bound: value >= bound),
        ("at most", declared.le, lambda bound: value <= bound),
    )
    bounds = [f"{word} {bound:.10g}" for word, bound, _ in tests if bound is not None]
    if any(bound is not None and not holds(bound) for _, bound, holds in tests):
        yield Mistake(
            path,
            f"{shown(value)}{suffix} is outside what is possible",
            f"it must be {' and '.join(bounds)}{suffix}",
        )


_NUMBER_IN_TEXT = re.compile(r"\s*([-+]?\d*[.,]?\d+(?:[eE][-+]?\d+)?)\s*([A-Za-zµμΩ%/]*)\s*")
_PREFIXES = {"": 1.0, "m": 1e-3, "u": 1e-6, "µ": 1e-6, "μ": 1e-6, "k": 1e3}


def _number_meant(text: str, unit: str) -> str:
    named = f"; the unit ({unit}) stands in the key" if unit not in ("", "1", "as the name") else ""
    match = _NUMBER_IN_TEXT.fullmatch(text)
    if match is None:
        return f"write a number without quotes{named}"
    number = float(match[1].replace(",", "."))
    written = match[2].replace("Ω", "ohm")
    for prefix, factor in _PREFIXES.items():
        if written in ("", prefix + unit):
            return f"write {number * (factor if written else 1.0):g} without quotes{named}"
    return f"{written} is another unit than the key's: convert it, and write the number without quotes{named}"


def _text(value: Any, declared: mi.StrType, path: str) -> Iterator[Mistake]:
    if not isinstance(value, str):
        yield Mistake(
            path, f"is {shown(value)}, where a text belongs", f'write it in quotes: "{shown(value)}"'
        )
    elif len(value) < (declared.min_length or 0):
        yield Mistake(path, "is empty", "write at least one character")
    elif declared.max_length is not None and len(value) > declared.max_length:
        yield Mistake(path, f"has {len(value)} characters", f"keep it to {declared.max_length}")


def _choice(
    value: Any, known: tuple[str, ...], path: str, offered: tuple[str, ...] | None = None
) -> Iterator[Mistake]:
    if value in known:
        return
    close = _closest(value, list(known)) if isinstance(value, str) else None
    meant = f'did you mean "{close}"? ' if close else ""
    yield Mistake(path, f"{shown(value)} is not known", f"{meant}It may be {_listed(offered or known)}")


def _closest(name: str, known: list[str]) -> str | None:
    """The likely spelling: the same letters in another case, the same quantity in another unit, or alike."""
    folded = {word.casefold(): word for word in known}
    if name.casefold() in folded:
        return folded[name.casefold()]
    stem = name.rpartition("_")[0] or name
    same_quantity = [
        word for word in known if word.rpartition("_")[0] == stem or word.rpartition("_")[0] == name
    ]
    if len(same_quantity) == 1:
        return same_quantity[0]
    found = difflib.get_close_matches(name.casefold(), folded, n=1, cutoff=0.6)
    return folded[found[0]] if found else None


def _tables(root: mi.Type, path: str = "") -> Iterator[tuple[str, mi.StructType]]:
    declared = bare(root)
    if isinstance(declared, mi.StructType):
        if path:
            yield path, declared
        for field in declared.fields:
            yield from _tables(field.type, join(path, field.encode_name))


def _listed(words: Mapping[str, Any] | tuple[str, ...]) -> str:
    *most, last = words
    return f"{', '.join(most)} or {last}" if most else last


def _quoted(key: str) -> str:
    plain = re.fullmatch(r"[A-Za-z0-9_-]+", key)
    return key if plain and len(key) <= 60 else shown(key)
