"""Count the records of a duty once more with the public ``rainflow`` package, and say whether it agrees."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

import numpy as np

from springlife.life.reading import record_spec
from springlife.life.tally import recount
from springlife.units import significant

if TYPE_CHECKING:
    from springlife.life.assess import Assessment
    from springlife.life.case_input import EventInput
    from springlife.life.reading import EventReading

MOST_SAMPLES = 2_000_000  # the package takes about a microsecond a sample


def recounted(result: Assessment) -> Iterator[tuple[str, str]]:
    """Yield each recorded event's name and what the recount found."""
    assert result.duty is not None
    for given, event in zip(result.case.duty.event, result.duty.events, strict=True):
        if event.recorded:
            yield event.name, _outcome(result, given, event)


def _outcome(result: Assessment, given: EventInput, event: EventReading) -> str:
    from springlife.duty.record import open_record

    if event.summary is None or event.summary.samples > MOST_SAMPLES:
        return f"not recounted: more than {MOST_SAMPLES} samples"
    if not event.count.exact:
        return "not recounted: too many distinct cycles to keep each exactly"
    samples = np.concatenate(list(open_record(record_spec(result.case, given)).blocks()))
    theirs = recount(np.split(samples, np.flatnonzero(np.isnan(samples))))
    table = event.count.table("half")
    ours = {(a, b): n for a, b, n in zip(table.low.tolist(), table.high.tolist(), table.count.tolist(), strict=True)}
    total = significant(sum(theirs.values()), 6)
    if ours == theirs:
        return f"the same {total} cycles"
    different = sum(1 for key in ours.keys() | theirs.keys() if ours.get(key) != theirs.get(key))
    here = significant(sum(ours.values()), 6)
    return f"differs in {different} of {len(ours)} classes; {total} cycles there, {here} here"
