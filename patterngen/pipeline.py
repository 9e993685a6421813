"""The life of one run, in order: Job, what was left open, Design, beats, findings, files."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

import numpy as np

from patterngen import registry
from patterngen.errors import Fault, InputError
from patterngen.model.cells import guaranteeing_multiple, nearest_cell, smallest_supercell
from patterngen.model.design import Design, Layer, Sheet
from patterngen.model.evidence import Evidence
from patterngen.model.job import Job, Press
from patterngen.model.screen import Screen
from patterngen.model.seeing import Viewer
from patterngen.model.verdict import Finding, Verdict

if TYPE_CHECKING:
    from patterngen.beats.own import OwnTexture
    from patterngen.beats.together import Together
    from patterngen.colour.inks import InkStack

Stage = Callable[[str], None]

_SPECKS = 0.01
"""Share of a picture's printed area that counts as specks at either end of its tones."""

_DARKEST_PAPER_Y = 0.0299
"""Y of a paper at L 20."""


@dataclass(frozen=True, slots=True, eq=False)
class Proof:
    """A design with its verdict: what `build` needs to write, and what `verify` throws away."""

    design: Design
    verdict: Verdict
    colours: InkStack


def verify(job: Job, *, progress: Stage | None = None) -> Verdict:
    """Everything but the drawing files: derive, predict, judge.

    Raises `InputError` for a job that cannot be judged, for example an angle "choose".
    """
    return prove(job, progress=progress).verdict


def build(job: Job, out: str | Path = "out", *, keep_failed: bool = False, progress: Stage | None = None) -> Path:
    """Verify the job and write its files into `out`/<job>; returns that folder.

    When a rule failed only the verdict and the manifest are written, unless `keep_failed`.
    Raises `InputError` (nothing written) or `MachineError` (nothing half-written).
    """
    return write(prove(job, progress=progress), Path(out), keep_failed=keep_failed, progress=progress)


def prove(job: Job, *, progress: Stage | None = None) -> Proof:
    """Derive what was left open, compute every beat, judge."""
    from patterngen.beats.find import find_beats
    from patterngen.beats.own import own_textures
    from patterngen.beats.together import Together, tones_together
    from patterngen.colour.inks import InkStack
    from patterngen.job.check import too_much
    from patterngen.rules import _engine, _limits

    if not isinstance(job, Job):
        wanted = "what patterngen.load(preset) returns"
        raise InputError(Fault("verify", "", "a job is wanted", value=repr(job)[:60], allowed=wanted))
    tell = progress or _silent
    where = f"{job.name}.toml" if job.folder else job.name
    colours = InkStack.of(job)
    faults = [
        *_choose_faults(job, where),
        *_engine.waiver_faults(job.waivers, where=where),
        *_paper_faults(job, colours, where),
    ]
    if faults:
        raise InputError(faults)
    tell("deriving what was left open")
    job = _engine.derive(job)
    if faults := too_much(job, where=where):
        raise InputError(faults)
    design = make_design(job)
    screens = design.base.screens
    places = Together(screens, job.overprints, job.sheet)
    job = replace(job, remarks=(*job.remarks, *_remarks(places)))
    design = replace(design, job=job)
    viewer = viewer_of(job, colours)
    limits = {**_limits.limits(job.press.process), **job.press.limits}
    tell("finding beats")
    beats, balance = find_beats(
        screens=screens,
        grids=design.grids,
        colours=colours,
        viewer=viewer,
        sheet=job.sheet,
        press=job.press,
        overprints=job.overprints,
        shadow=limits["shadow"].value,
    )
    tell("judging")
    together = tones_together(screens, job.overprints, job.sheet, window_mm=0.0)
    most_ink, heaviest = places.heaviest()
    extremes = {screen.name: tone_extremes(screen) for screen in screens}
    eye = registry.load("patterngen.vision", job.viewing.eye)
    textures = own_textures(screens, together, colours=colours, viewer=viewer)
    evidence = Evidence(
        design=design,
        beats=beats,
        balance=balance,
        limits=limits,
        tones_together=together,
        luminance=colours.luminance(),
        tone_extremes={name: found for name, found in extremes.items() if found},
        shapes_drawn={name: None if found else 0 for name, found in extremes.items()},
        most_ink=most_ink,
        heaviest=heaviest,
        paper_y=paper_y(colours),
        eye_valid_cpd=eye.VALID_CPD,
        eye_takes_light=eye.TAKES_LIGHT,
    )
    findings = _engine.judge(evidence)
    verdict = Verdict(
        job=job.name,
        title=job.title,
        status=overall(findings),
        screens=tuple(
            screen_facts(screen, textures[screen.name], extremes[screen.name], job.press) for screen in screens
        ),
        beats=beats,
        balance=balance,
        findings=findings,
        derived=job.derived,
        notes={"remarks": list(job.remarks)},
    )
    return Proof(design, verdict, colours)


def write(proof: Proof, out: Path, *, keep_failed: bool, progress: Stage | None = None) -> Path:
    """Write the files of a proven job; the manifest comes last."""
    from patterngen.writers import _files, manifest, pdf, svg
    from patterngen.writers import verdict as verdict_writer

    tell = progress or _silent
    job = proof.design.job
    with _files.job_folder(out, job.name) as folder:
        if proof.verdict.status != "fail" or keep_failed:
            tell("writing base.pdf")
            folder.write("base.pdf", pdf.write(proof.design, progress=tell))
            tell("writing base.svg")
            folder.write("base.svg", svg.pieces(proof.design, rgb=proof.colours.rgb(), progress=tell))
        folder.write("verdict.json", verdict_writer.dumps(proof.verdict))
        folder.finish(manifest.dumps(job, folder.written, verdict=proof.verdict.status))
        return folder.path


def make_design(job: Job) -> Design:
    """Build the screens and grids of a fully derived job."""
    screens = {request.name: registry.load("patterngen.screens", request.kind).make(request) for request in job.screens}
    layers = tuple(
        Layer(ink, tuple(screens[request.name] for request in job.screens if request.ink == ink.name))
        for ink in job.inks
    )
    grids = tuple(registry.load("patterngen.grids", request.kind).make(request) for request in job.grids)
    return Design(job, Sheet(tuple(layer for layer in layers if layer.screens)), grids)


def viewer_of(job: Job, colours: InkStack) -> Viewer:
    """The job's observer: two distances, two limits, one eye, in the job's light on its paper."""
    from patterngen.vision import viewer

    return viewer(job.viewing, paper_y=paper_y(colours))


def paper_y(colours: InkStack) -> float:
    """Y of the bare paper, the perfect diffuser at 1."""
    return float(colours.primaries(())[1])


def overall(findings: tuple[Finding, ...]) -> Literal["pass", "warn", "fail"]:
    """The verdict that the findings add up to; what is waived no longer fails, but warns."""
    statuses = {finding.status for finding in findings}
    if "fail" in statuses:
        return "fail"
    return "warn" if statuses & {"warn", "waived"} else "pass"


def tone_extremes(screen: Screen) -> tuple[float, float] | None:
    """(smallest tone, largest) on the plate; None where the screen draws nothing.

    Of a picture those that hold on a hundredth of what it prints at the least: single specks
    of a photograph say nothing about a press.
    """
    if screen.area.area_mm2() <= 0.0:
        return None
    if screen.tone.constant is not None:
        return (screen.tone.constant, screen.tone.constant) if screen.tone.constant > 0.0 else None
    x0, y0, x1, y1 = screen.area.box_mm
    steps = (np.arange(512) + 0.5) / 512
    grid_x, grid_y = np.meshgrid(x0 + steps * (x1 - x0), y0 + steps * (y1 - y0))
    x, y = grid_x.ravel(), grid_y.ravel()
    tones = screen.tone.at(x, y, size_mm=1.0 / screen.ruling_per_mm)[screen.area.contains(x, y)]
    tones = tones[tones > 1e-4]
    if not len(tones):
        return None
    low, high = np.quantile(tones, [_SPECKS, 1.0 - _SPECKS], method="nearest")
    return float(low), float(high)


def screen_facts(
    screen: Screen, texture: OwnTexture, extremes: tuple[float, float] | None, press: Press
) -> dict[str, Any]:
    """What the verdict says of one screen, its own visibility (without any other screen) included."""
    tone = screen.tone.constant
    return {
        "name": screen.name,
        "ink": screen.ink,
        "kind": screen.kind,
        "shape": screen.shape,
        "ruling_per_mm": screen.ruling_per_mm,
        "angle_deg": screen.angle_deg,
        "frequencies_per_mm": [[float(f) for f in row] for row in screen.frequencies_per_mm],
        "tone": tone,
        "tone_range": list(extremes or (0.0, 0.0)),
        "printed_tone": None if tone is None else float(screen.printed_tone(tone)),
        "contrast": texture.contrast,
        "visibility": texture.visibility,
        "visibility_far": texture.visibility_far,
        "imager_cell": _imager_cell(screen, press),
    }


def _imager_cell(screen: Screen, press: Press) -> dict[str, Any] | None:
    """What one cell of the imager's pixels makes of a screen, and the supercell that keeps the press's errors."""
    if press.imager_per_mm is None:
        return None
    cells = press.imager_per_mm / screen.ruling_per_mm
    one = nearest_cell(cells=cells, angle_deg=screen.angle_deg)
    kept, always = None, None
    if press.angle_error_deg > 0.0 and press.size_error > 0.0:
        kept = smallest_supercell(
            cells=cells,
            angle_deg=screen.angle_deg,
            angle_error_deg=press.angle_error_deg,
            ruling_error=press.size_error,
        )
        always = guaranteeing_multiple(cells=cells, angle_error_deg=press.angle_error_deg)
    return {
        "pixels": [one.a, one.b],
        "brick": list(one.brick),
        "angle_deg": one.angle_deg,
        "ruling_per_mm": one.ruling(press.imager_per_mm),
        "supercell_within_press_errors": None if kept is None else kept.multiple,
        "supercell_for_any_angle": always,
    }


def _choose_faults(job: Job, where: str) -> list[Fault]:
    """"choose" is a question to the search, not a value that can be built."""
    return [
        Fault(
            where,
            f"screen.{screen.name}.{key}",
            '"choose" is for the search',
            allowed="a value, or nothing (then the usual one is derived); the command `patterngen angles` "
            "that answers it is not part of this version",
        )
        for screen in job.screens
        for key in screen.params.get("choose", ())
    ]


def _paper_faults(job: Job, colours: InkStack, where: str) -> list[Fault]:
    """Contrast on a paper that reflects next to nothing has no meaning."""
    if paper_y(colours) >= _DARKEST_PAPER_Y:
        return []
    lab = ", ".join(f"{part:g}" for part in job.paper_lab)
    return [Fault(where, "paper.lab", "a paper too dark to print on", value=f"[{lab}]", allowed="L of 20 or more")]


def _remarks(places: Together) -> tuple[str, ...]:
    """What only shows once the areas are laid on each other."""
    return tuple(
        f"{one} and {other} are said never to meet, but their screens print on common ground: "
        "they are not judged together there"
        for one, other in places.meeting_though_never()
    )


def _silent(stage: str) -> None:
    """Progress that nobody listens to."""
