"""Responses kept for what-if, and the share of each link in what a receptor sees."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from roaddisp.dispersion.compiling import using_threads
from roaddisp.engine.hours import UGM3_PER_GM3
from roaddisp.engine.kept import KeptResponses, keep, link_means
from roaddisp.model import FloatArray, IntArray, Study
from roaddisp.pipeline import Timer, calms_at, check_fit, named_scenario, only, prepare


def keep_responses(
    study: Study,
    *,
    scenario: str | None = None,
    receptors: Sequence[str] | None = None,
    groups: Mapping[str, str] | None = None,
    threads: int | None = None,
) -> KeptResponses:
    """Compute what receptors see of the roads, to be kept for what-if.

    Parameters
    ----------
    study : Study
    scenario : str, optional
        ``"base"`` where not given.
    receptors : sequence of str, optional
        Ids of the receptors; all where not given.
    groups : mapping of link to group name, optional
        Links that will change together. Where not given every link is kept apart,
        which any change of traffic may follow; groups take less memory.
    threads : int, optional
        As in `run`.

    Returns
    -------
    KeptResponses
        For `run` (``responses=``), `link_contributions` and `write_responses`.

    Raises
    ------
    StudyError
        Where the study has no such scenario.
    ValueError
        Where a receptor or a link is unknown or missing, or the responses would take
        more than 4 GiB.

    Examples
    --------
    >>> import tempfile, roaddisp as rd
    >>> from roaddisp.study.new import new_study
    >>> folder = tempfile.TemporaryDirectory()
    >>> _ = new_study(folder.name)
    >>> study = rd.read_study(folder.name)
    >>> kept = rd.keep_responses(study, receptors=["classroom"])
    >>> rd.run(study, responses=kept).summary["receptor"].tolist()
    ['classroom']
    >>> folder.cleanup()
    """
    whole = named_scenario(study, scenario or "base")
    names = whole.receptors.receptor
    chosen = tuple(range(len(names))) if receptors is None else _places(receptors, names)
    part = only(whole, chosen)
    ready = prepare(part, Timer())
    with using_threads(threads):
        return keep(
            ready.segments,
            ready.strengths,
            part.receptors,
            ready.states,
            chosen=chosen,
            terrain=part.options.terrain,
            calms_at=calms_at(part),
            group=None if groups is None else _link_groups(groups, part.network.link),
        )


def link_contributions(
    study: Study, responses: KeptResponses, *, scenario: str | None = None
) -> FloatArray:
    """Mean road NOx and primary NO2 that each link gives to each kept receptor.

    Parameters
    ----------
    study : Study
    responses : KeptResponses
        With every link apart.
    scenario : str, optional

    Returns
    -------
    (K, L, R) [ug/m3 as NO2]
        Over the hours that have weather and traffic, calm hours left out: NOx, then
        primary NO2. The sum over the links is the roads' mean.

    Raises
    ------
    StudyError
        Where kept responses do not fit the scenario.
    ValueError
        Where links were kept in groups.
    """
    chosen = only(named_scenario(study, scenario or "base"), responses.receptors)
    ready = prepare(chosen, Timer())
    check_fit(study, chosen, ready, responses)
    return UGM3_PER_GM3 * link_means(responses, ready.strengths, ready.weather)


def _places(wanted: Sequence[str], names: tuple[str, ...]) -> tuple[int, ...]:
    place = {name: index for index, name in enumerate(names)}
    unknown = [name for name in wanted if name not in place]
    if unknown:
        raise ValueError(f"receptors: no receptor is called {', '.join(map(repr, unknown[:5]))}")
    return tuple(sorted({place[name] for name in wanted}))


def _link_groups(groups: Mapping[str, str], links: tuple[str, ...]) -> IntArray:
    lacking = [link for link in links if link not in groups]
    if lacking:
        raise ValueError(f"groups: no group is named for link {', '.join(map(repr, lacking[:5]))}")
    names = list(dict.fromkeys(groups[link] for link in links))
    return np.array([names.index(groups[link]) for link in links], dtype=np.int64)
