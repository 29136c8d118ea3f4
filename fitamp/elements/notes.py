"""What a reader of an element estimate must know beside the numbers."""

from __future__ import annotations

from collections.abc import Iterator

from fitamp.elements.circuit import UNITS
from fitamp.elements.result import ElementEstimate, ElementNote, ElementNoteCode, EstimatedElement, SweepCheck
from fitamp.estimate import Known
from fitamp.units import si, si_with_error

__all__ = ["notes_on"]

# So many of its own spreads from the design, an element is not explained by them.
FAR_SPREADS = 3.0
# Elements are the same at temperatures no farther apart than this; a transconductance moves by some 0.3 % per kelvin.
SAME_TEMPERATURE = 2.0


def notes_on(estimate: ElementEstimate) -> tuple[ElementNote, ...]:
    """Notes in the order of their weight."""
    return tuple(
        note
        for notes in (
            _on_changes(estimate.checks),
            _on_adequacy(estimate.checks),
            _on_search(estimate),
            _on_elements(estimate),
            _on_bench(estimate),
        )
        for note in notes
    )


def _on_changes(checks: tuple[SweepCheck, ...]) -> Iterator[ElementNote]:
    changed = [check for check in checks if check.changed]
    if not changed:
        return
    files = tuple(check.file for check in changed if not check.left_out)
    if files:
        yield ElementNote(
            code=ElementNoteCode.PART_CHANGED,
            message=f"the sweeps do not show the same part, and it is not plain that only {' or '.join(files)} stands "
            "apart; all were kept, with errors as wide as they contradict one another; check what was added in each, "
            "and whether part or bench changed",
            files=files,
        )
    for check in changed:
        if check.left_out:
            yield ElementNote(
                code=ElementNoteCode.PART_CHANGED,
                message=f"{check.file} does not show the same part as the other sweeps{_suspicion(check)}; it was left "
                "out; check what was added there, and whether part or bench changed",
                files=(check.file,),
            )


def _suspicion(check: SweepCheck) -> str:
    change = check.suspect_change
    if check.suspect is None or change is None or change.value is None:
        return ""
    way = "larger" if change.value > 0 else "smaller"
    amount = si_with_error(abs(change.value), change.stderr, UNITS[check.suspect])
    return f": {check.suspect} would have to be {way} by {amount} there"


def _on_adequacy(checks: tuple[SweepCheck, ...]) -> Iterator[ElementNote]:
    for check in checks:
        if not (check.adequacy.adequate or check.left_out):
            yield ElementNote(
                code=ElementNoteCode.CIRCUIT_INADEQUATE,
                message=f"{check.file}: the circuit does not describe the sweep: {check.adequacy.sentence}",
                files=(check.file,),
            )


def _on_search(estimate: ElementEstimate) -> Iterator[ElementNote]:
    if not estimate.solution.optimum.converged:
        yield ElementNote(
            code=ElementNoteCode.NOT_CONVERGED,
            message="the search for the elements did not settle; the sweeps leave too much open",
        )
    other = estimate.other_valley
    if other is not None:
        mine = estimate.amplifier
        apart = [
            f"{name} {si(getattr(mine, name), UNITS[name])} or {si(getattr(other, name), UNITS[name])}"
            for name in ("gm1", "R1", "C1", "gm2", "R2", "CL", "Cc", "Rz")
            if abs(getattr(mine, name) - getattr(other, name)) > 0.01 * abs(getattr(mine, name))
        ]
        yield ElementNote(
            code=ElementNoteCode.TWO_VALLEYS,
            message=f"two sets of elements describe the sweeps equally well: {', '.join(apart)}; a sweep with an added "
            "load or resistance tells them apart",
        )


def _on_elements(estimate: ElementEstimate) -> Iterator[ElementNote]:
    for one in estimate.elements:
        spreads = _spreads_off(one)
        if spreads is not None and abs(spreads) > FAR_SPREADS:
            way = "above" if spreads > 0 else "below"
            why = "its spread, or what was added, is not as stated"
            if spreads > 0 and one.name in ("CL", "C1"):
                why = f"there is capacitance that nobody designed, or {why}"
            yield ElementNote(
                code=ElementNoteCode.FAR_FROM_DESIGN,
                message=f"{one.name} comes out {abs(spreads):.1f} of its own spreads {way} the design; {why}",
            )
    if estimate.solution.unbounded is not None:
        resistor = estimate.element("Rz")
        yield ElementNote(
            code=ElementNoteCode.RESISTOR_AT_LEAST,
            message=f"Rz is at the least that it can be, {si(resistor.estimate.value, 'Ω')}, and by 95 % not above "
            f"{si(resistor.estimate.ci95[1], 'Ω', digits=3)}",
        )
    undetermined = [one.name for one in estimate.elements if one.estimate.known is Known.UNDETERMINED]
    if undetermined:
        yield ElementNote(
            code=ElementNoteCode.UNDETERMINED,
            message=f"{', '.join(undetermined)} cannot be told from these sweeps, and the design says nothing of "
            f"{'it' if len(undetermined) == 1 else 'them'}",
        )
    handed_back = [one.name for one in estimate.elements if not (one.held or one.is_informed or one.spread is None)]
    if handed_back:
        yield ElementNote(
            code=ElementNoteCode.NOT_INFORMED,
            message=f"what is said of {', '.join(handed_back)} comes from the design more than from the sweeps; sweeps "
            "with added loads and resistances tell them",
        )


def _spreads_off(one: EstimatedElement) -> float | None:
    if one.held or not one.spread or one.deviation is None:
        return None
    return one.deviation / one.spread


def _on_bench(estimate: ElementEstimate) -> Iterator[ElementNote]:
    delay = next((one for one in estimate.bench if one.name == "bench_delay_s"), None)
    if delay is not None and delay.designed is None:
        value = delay.estimate.value
        found = "cannot be told from these sweeps" if value is None else f"was fitted, as {si(value, 's', digits=3)}"
        yield ElementNote(
            code=ElementNoteCode.DELAY_NOT_STATED,
            message=f"the bench's delay is not stated; it {found}, and makes the rest less certain",
        )
    temperatures = [condition.temp_c for condition in estimate.conditions if condition.temp_c is not None]
    if temperatures and max(temperatures) - min(temperatures) > SAME_TEMPERATURE:
        yield ElementNote(
            code=ElementNoteCode.TEMPERATURES_DIFFER,
            message=f"the sweeps were taken from {min(temperatures):g} to {max(temperatures):g} °C and share their "
            "elements all the same; take them at one temperature",
        )
    taken = tuple(one.sweep.origin.file for one in estimate.solution.sweeps if one.factor is not None)
    if taken:
        yield ElementNote(
            code=ElementNoteCode.FACTOR_TAKEN_OVER,
            message=f"{', '.join(taken)}: what is there beside the amplifier (a resonance, a doublet, a range step) is "
            "taken as the fit of two poles and a zero found it; its own uncertainty is not in the errors",
            files=taken,
        )
