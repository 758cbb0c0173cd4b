"""What the documents say is what the program does."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from roaddisp.app.command import app
from roaddisp.standards.rules import standards
from roaddisp.study.document import document_inputs

REPOSITORY = Path(__file__).parents[1]
PAGES = [
    REPOSITORY / "README.md",
    REPOSITORY / "DEVELOPERS.md",
    *(REPOSITORY / "docs").glob("*.md"),
]


def test_the_page_of_inputs_is_what_the_command_prints() -> None:
    page = (REPOSITORY / "docs" / "inputs.md").read_text(encoding="utf-8")
    assert page == document_inputs(), "write it again: roaddisp inputs > docs/inputs.md"


@pytest.mark.parametrize("page", PAGES, ids=lambda page: page.name)
def test_links_lead_somewhere(page: Path) -> None:
    for target in re.findall(r"\]\(([^)#]+)\)", page.read_text(encoding="utf-8")):
        assert (page.parent / target).exists(), target


@pytest.mark.parametrize("page", PAGES, ids=lambda page: page.name)
def test_commands_named_are_commands(page: Path) -> None:
    """Only in code: ``roaddisp run`` and the like."""
    known = {command.name for command in app.registered_commands}
    for name in re.findall(r"(?m)(?:`|^|/)roaddisp ([a-z]+)\b", page.read_text(encoding="utf-8")):
        assert name in known, f"{page.name} names roaddisp {name}"


def test_the_method_statement_has_every_standard() -> None:
    text = (REPOSITORY / "docs" / "method.md").read_text(encoding="utf-8")
    for rule in standards().values():
        assert f"| `{rule.name}` | {rule.level:g} {rule.unit} |" in text
