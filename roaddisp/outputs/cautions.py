"""What every file that leaves a run says about its own limits."""

from __future__ import annotations

from roaddisp.model import Result

SCREENING = (
    "Modelled estimates for screening and comparison, not measurements. Before anything rests on "
    "them, check them against the reviewing agency's current rules, the local code and the "
    "judgement of a licensed practitioner."
)

BRIGGS_NEAR = (
    "Spread follows Briggs (1973), published for 100 m to 10 km: nearer than 100 m to a road it "
    "is extrapolated."
)

BUILT_IN_FACTORS = (
    "Emission factors are the built-in screening table, not an approved one: replace them with "
    "the factors the reviewing agency asks for."
)


def cautions(result: Result) -> tuple[str, ...]:
    """Cautions that hold for a result, each a text of its own.

    Parameters
    ----------
    result : Result

    Returns
    -------
    tuple of str
        For every run the first two; one more where built-in factors were used.
    """
    texts = [SCREENING]
    if result.scenario.options.curves == "briggs":
        texts.append(BRIGGS_NEAR)
    if result.scenario.factors.built_in:
        texts.append(BUILT_IN_FACTORS)
    return tuple(texts)
