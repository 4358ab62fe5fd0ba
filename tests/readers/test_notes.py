"""The page on captures lists the notes of the readers, of conditioning and of measuring, all and no others."""

import ast
import re
from pathlib import Path

import flicker

PACKAGE = Path(flicker.__file__).parent
PAGE = PACKAGE.parent / "docs" / "captures.md"


def codes_in(file):
    for node in ast.walk(ast.parse(file.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Call) and getattr(node.func, "id", "") == "Note":
            yield node.args[0].value


def test_every_note_is_explained():
    readers = [file for file in (PACKAGE / "readers").glob("*.py") if "video" not in file.name]
    others = [*(PACKAGE / "conditioning").glob("*.py"), PACKAGE / "doubts.py"]
    in_code = {code for file in [*readers, *others] for code in codes_in(file)}
    explained = set(re.findall(r"^\| `([a-z-]+)` \|", PAGE.read_text(encoding="utf-8"), re.MULTILINE))
    assert explained == in_code
