"""Commands of the contract that this version does not deliver, and says so."""

from __future__ import annotations

from collections.abc import Callable

import typer

from roaddisp.app.guard import guarded
from roaddisp.errors import NotYetError

LATER = {
    "setback": "the distance at which each standard is met",
    "compare": "one scenario against another",
    "explain": "the working of one number",
    "report": "figures, tables and a printed report",
    "shortlist": "network screening without a weather year",
    "region": "many sites on a network",
}


def register(app: typer.Typer) -> None:
    """Give each later command its place; each refuses with the reason."""
    for name, purpose in LATER.items():
        app.command(
            name,
            help=f"Not in this version: {purpose}.",
            context_settings={"allow_extra_args": True, "ignore_unknown_options": True},
            hidden=True,
        )(_refusal(name, purpose))


def _refusal(name: str, purpose: str) -> Callable[[], None]:
    @guarded
    def refuse() -> None:
        raise NotYetError(
            f"`roaddisp {name}` ({purpose}) is planned and not in this version; "
            "`roaddisp run` gives receptor tables, layers, a map and the record"
        )

    return refuse
