"""The corridor file as text: where a key stands, what is wrong in words, and the file that ``geomap new`` writes.

Nothing here knows a key; all of it is read from the model that `corridor` declares.
"""

from __future__ import annotations

import json
import re
from typing import Any

from pydantic import BaseModel

from geomap.errors import problem
from geomap.registry import no_such_name

KINDS = ("str", "list[str]", "float")  # pydantic names the kind tried at the end, where a key may be of several
ALLOWED_KINDS: dict[Any, str] = {
    str | list[str]: "a file name or a list of them",
    float | str: "a finite number, or a chainage as text",
}
SHOWN_ONCE = ("sheet", "crs", "columns")  # keys that every table may have; the template shows them under [borings]


def place(name: str, text: str, keys: tuple[Any, ...]) -> str:
    """Return ``file:line: [section] key``; the line of the nearest key that stands in the file."""
    words = [str(k) for k in keys if not isinstance(k, int) and k not in KINDS]
    section = ""
    found: dict[str, int] = {}
    for number, line in enumerate(text.splitlines(), 1):
        if head := re.match(r"\s*\[+\s*([^\]]+?)\s*\]+", line):
            section = head.group(1).replace('"', "")
            found.setdefault(section, number)
        elif key := re.match(r'\s*"?([^"=#\s]+)"?\s*=', line):
            found.setdefault(f"{section}.{key.group(1)}".strip("."), number)
    known = [found[".".join(words[:n])] for n in range(len(words), 0, -1) if ".".join(words[:n]) in found]
    number = known[0] if known else 1
    label = f"[{words[0]}] {'.'.join(words[1:])}".strip() if words else ""
    return f"{name}:{number}: {label}"


def model_at(root: type[BaseModel], keys: tuple[Any, ...]) -> type[BaseModel]:
    """Return the model of the section that `keys` leads to."""
    model: Any = root
    for key in keys:
        kind = model.model_fields[key].annotation if key in getattr(model, "model_fields", {}) else None
        parts = [kind, *getattr(kind, "__args__", ())]
        model = next((p for p in parts if isinstance(p, type) and issubclass(p, BaseModel)), model)
    return model  # type: ignore[no-any-return]


def unknown_key(name: str, text: str, keys: tuple[Any, ...], model: type[BaseModel]) -> str:
    """Return the message for a key that the model does not have."""
    known = [k for k in model.model_fields if k != "path"]
    return no_such_name(str(keys[-1]), known, place(name, text, keys))


def sentence(root: type[BaseModel], name: str, text: str, error: Any) -> str:
    """Return one problem that pydantic found, in the house pattern."""
    keys = tuple(error["loc"])
    if error["type"] == "extra_forbidden":
        return unknown_key(name, text, keys, model_at(root, keys[:-1]))
    where = place(name, text, keys)
    if error["type"] == "missing":
        return problem(where, "nothing", "a value: this key is required", f"add `{keys[-1]}`")
    kinds = keys[-1] in KINDS and model_at(root, keys[:-2]).model_fields[keys[-2]].annotation
    allowed = ALLOWED_KINDS.get(kinds, error["msg"])
    return problem(where, error["input"], allowed.removeprefix("Input should be "), "correct the value")


def template(root: type[BaseModel]) -> str:
    """Return the text of a new file: every key with its meaning; optional ones are commented out."""
    lines = [
        "# A corridor for geomap. Paths are relative to this file.",
        "# A line that begins with # is optional: take the # away to use it.",
    ]
    for name, field in root.model_fields.items():
        section = model_at(root, (name,))
        if section is root:
            continue
        off = "" if field.is_required() or field.default_factory else "# "
        lines += ["", f"# {field.description}", f"{off}[{name}]"]
        for key, entry in section.model_fields.items():
            if key in SHOWN_ONCE and "file" in section.model_fields and name != "borings":
                continue
            default = entry.get_default(call_default_factory=True, validated_data={})
            value = _toml_value(entry.examples[0] if entry.examples else default)
            mark = off if entry.is_required() else "# "
            needed = " (required in this section)" if off and entry.is_required() else ""
            lines.append(f"{mark}{key} = {value}".ljust(48) + f"  # {entry.description}{needed}")
    return "\n".join(lines) + "\n"


def _toml_value(value: object) -> str:
    if isinstance(value, dict):
        return "{ " + ", ".join(f"{k} = {_toml_value(v)}" for k, v in value.items()) + " }"
    if isinstance(value, list):
        return "[" + ", ".join(_toml_value(v) for v in value) + "]"
    return json.dumps(value)
