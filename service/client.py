"""A small client: `Client("http://127.0.0.1:8000").shift("87Rb", line=780, lower="2,2", upper="3,3", field=3.2)`.

Every question is a method of its own and answers with the record that the server documents; a refused question raises
`Refused` with the problem's members.
"""

import json
from collections.abc import Iterator
from types import TracebackType
from typing import Any, Self, TypeVar
from urllib.parse import quote

import httpx2
from pydantic import BaseModel

from service import catalogue_shapes, search_shapes
from service.lightshift_shapes import LightshiftAnswered, PolarisabilityAnswered
from service.plan_shapes import PlanAnswered
from service.problems import ProblemBody
from service.repump_shapes import RepumpAnswered
from service.routes import (
    angular,
    book,
    components,
    cooling,
    evolution,
    features,
    field,
    findings,
    force,
    formula,
    geometry,
    gradients,
    insensitive,
    magic,
    multiplet,
    pairs,
    profile,
    remedies,
    scan,
    shift,
    slower,
    strengths,
    sublevels,
    sweep,
    trap,
    trapcheck,
)
from service.schemas import Answered
from service.scheme_shapes import SchemeAnswered

Answer = TypeVar("Answer", bound=BaseModel)


class Refused(Exception):
    """The server answered with a problem; `problem` says what would do."""

    def __init__(self, problem: ProblemBody) -> None:
        super().__init__(f"{problem.title}: {problem.detail}")
        self.problem = problem


class Client:
    """One connection to a server; usable in a `with` statement."""

    def __init__(self, base_url: str = "http://127.0.0.1:8000", *, seconds: float = 30.0) -> None:
        self._http = httpx2.Client(base_url=base_url, timeout=seconds)

    def __enter__(self) -> Self:
        return self

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None, at: TracebackType | None) -> None:
        self.close()

    def close(self) -> None:
        """Close the connection."""
        self._http.close()

    def atoms(self) -> catalogue_shapes.AtomsAnswered:
        """Every isotope."""
        return self._get("/v1/atoms", {}, catalogue_shapes.AtomsAnswered)

    def atom(self, atom: str) -> catalogue_shapes.AtomAnswered:
        """One isotope."""
        return self._get(_atom(atom), {}, catalogue_shapes.AtomAnswered)

    def levels(self, atom: str) -> catalogue_shapes.LevelsAnswered:
        """Every level of an isotope."""
        return self._get(f"{_atom(atom)}/levels", {}, catalogue_shapes.LevelsAnswered)

    def lines(self, atom: str) -> catalogue_shapes.LinesAnswered:
        """Every line of an isotope."""
        return self._get(f"{_atom(atom)}/lines", {}, catalogue_shapes.LinesAnswered)

    def sources(self) -> Answered:
        """Every publication, with the values that rest on it."""
        return self._get("/v1/sources", {}, Answered)

    def source(self, id: str) -> catalogue_shapes.SourceAnswered:
        """One publication, by its key in any answer's `sources`."""
        return self._get(f"/v1/sources/{quote(id, safe='')}", {}, catalogue_shapes.SourceAnswered)

    def release(self) -> catalogue_shapes.ReleaseAnswered:
        """The data release."""
        return self._get("/v1/release", {}, catalogue_shapes.ReleaseAnswered)

    def find_lines(self, **asked: Any) -> search_shapes.LinesFound:
        """Lines over all species: `near`, `within`, `unit`, `medium`, `species`, `min_width`, `lower` and others."""
        return self._get("/v1/lines", asked, search_shapes.LinesFound)

    def find_levels(self, **asked: Any) -> search_shapes.LevelsFound:
        """Levels over all species: `level`, `term`, `J`, `min_lifetime` and others."""
        return self._get("/v1/levels", asked, search_shapes.LevelsFound)

    def book(self) -> book.BookAnswered:
        """The whole book, as published."""
        return self._get("/v1/book", {}, book.BookAnswered)

    def shift(self, atom: str, **asked: Any) -> shift.ShiftAnswered:
        """One component of a line: `line`, `lower`, `upper`, `field`."""
        return self._get(f"{_atom(atom)}/shift", asked, shift.ShiftAnswered)

    def sublevels(self, atom: str, **asked: Any) -> sublevels.SublevelsAnswered:
        """Every sublevel of a level: `level`, `field`."""
        return self._get(f"{_atom(atom)}/sublevels", asked, sublevels.SublevelsAnswered)

    def components(self, atom: str, **asked: Any) -> components.ComponentsAnswered:
        """Every component of a line: `line`, `field`, `polarisation`."""
        return self._get(f"{_atom(atom)}/components", asked, components.ComponentsAnswered)

    def strengths(self, atom: str, **asked: Any) -> strengths.StrengthsAnswered:
        """The hyperfine components of a line: `line`."""
        return self._get(f"{_atom(atom)}/strengths", asked, strengths.StrengthsAnswered)

    def insensitive(self, atom: str, **asked: Any) -> insensitive.InsensitiveAnswered:
        """Field-insensitive pairs: `level`, `upper_level`, `max_field`, `max_dm`."""
        return self._get(f"{_atom(atom)}/insensitive", asked, insensitive.InsensitiveAnswered)

    def field(self, atom: str, **asked: Any) -> field.FieldAnswered:
        """The field of a splitting: `level`, `lower`, `upper`, `splitting`, `uncertainty`, `max_field`."""
        return self._get(f"{_atom(atom)}/field", asked, field.FieldAnswered)

    def crossings(self, atom: str, **asked: Any) -> multiplet.CrossingsAnswered:
        """Level crossings of a term: `level`, `max_field`, `max_dm`."""
        return self._get(f"{_atom(atom)}/crossings", asked, multiplet.CrossingsAnswered)

    def multiplet(self, atom: str, **asked: Any) -> multiplet.MultipletAnswered:
        """A whole fine-structure term: `level`, `field`."""
        return self._get(f"{_atom(atom)}/multiplet", asked, multiplet.MultipletAnswered)

    def force(self, atom: str, **asked: Any) -> force.ForceAnswered:
        """Scattering rate and force: `line`, `against`, `start`, `stop`, `points`."""
        return self._get(f"{_atom(atom)}/force", asked, force.ForceAnswered)

    def slower(self, atom: str, **asked: Any) -> slower.SlowerAnswered:
        """A slower's field: `line`, `initial_speed`, `final_speed`, `detuning`."""
        return self._get(f"{_atom(atom)}/slower", asked, slower.SlowerAnswered)

    def gradients(self, atom: str, **asked: Any) -> gradients.GradientsAnswered:
        """Polarisation-gradient cooling: `line`, `component`, `detuning`, `saturation`."""
        return self._get(f"{_atom(atom)}/gradients", asked, gradients.GradientsAnswered)

    def cooling(self, atom: str, **asked: Any) -> cooling.CoolingAnswered:
        """Cooling figures of a line: `line`, `detuning`, `intensity`, `gradient` and more."""
        return self._get(f"{_atom(atom)}/cooling", asked, cooling.CoolingAnswered)

    def trap(self, atom: str, **asked: Any) -> trap.TrapAnswered:
        """Magnetic trapping: `level`, `bottom`, `max_field`, `depth`."""
        return self._get(f"{_atom(atom)}/trap", asked, trap.TrapAnswered)

    def formula(self, atom: str, **asked: Any) -> formula.FormulaAnswered:
        """A formula of the field: `level` and `sublevel`, or `line`, `lower` and `upper`; `**{"as": "c"}`."""
        return self._get(f"{_atom(atom)}/formula", asked, formula.FormulaAnswered)

    def repump(self, atom: str, **asked: Any) -> RepumpAnswered:
        """Leaks, repumpers and photons before loss: `drive`, `detuning`, `saturation`, `field`."""
        return self._get(f"{_atom(atom)}/repump", asked, RepumpAnswered)

    def features(self, element: str, **asked: Any) -> features.FeaturesAnswered:
        """What a vapour cell shows of a line: `line`, `temperature`, `isotopes`, `crossovers`."""
        return self._get(f"{_element(element)}/features", asked, features.FeaturesAnswered)

    def profile(self, element: str, **asked: Any) -> profile.ProfileAnswered:
        """The shape of a line in a vapour: `line`, `temperature`, `start`, `stop`, `points`."""
        return self._get(f"{_element(element)}/profile", asked, profile.ProfileAnswered)

    def lightshift(self, atom: str, **asked: Any) -> LightshiftAnswered:
        """What a light does to every sublevel: `level`, `wavelength`, `polarisation`, `field`, `power`, `waist`."""
        return self._get(f"{_atom(atom)}/lightshift", asked, LightshiftAnswered)

    def polarisability(self, atom: str, **asked: Any) -> PolarisabilityAnswered:
        """A polarisability against wavelength: `level`, `F`, `start`, `stop`, `points`."""
        return self._get(f"{_atom(atom)}/polarisability", asked, PolarisabilityAnswered)

    def magic(self, atom: str, **asked: Any) -> magic.MagicAnswered:
        """Magic conditions and tune-outs: `solve`, `level`, `lower`, `upper_level`, `upper` and what is held."""
        return self._get(f"{_atom(atom)}/magic", asked, magic.MagicAnswered)

    def pairs(self, atom: str, **asked: Any) -> pairs.PairsAnswered:
        """Ranked pairs for clocks and qubits: `level`, `upper_level`, `max_field`, `wavelength`."""
        return self._get(f"{_atom(atom)}/pairs", asked, pairs.PairsAnswered)

    def lande(self, **asked: Any) -> angular.LandeAnswered:
        """Lande factors: `J`, `L`, `S`, `I`, `F`."""
        return self._get("/v1/angular/lande", asked, angular.LandeAnswered)

    def clebsch_gordan(self, **asked: Any) -> angular.SymbolAnswered:
        """Clebsch-Gordan coefficient: `j1`, `m1`, `j2`, `m2`, `j`, `m`."""
        return self._get("/v1/angular/clebsch-gordan", asked, angular.SymbolAnswered)

    def three_j(self, **asked: Any) -> angular.SymbolAnswered:
        """3j symbol: `j1`, `j2`, `j3`, `m1`, `m2`, `m3`."""
        return self._get("/v1/angular/3j", asked, angular.SymbolAnswered)

    def six_j(self, **asked: Any) -> angular.SymbolAnswered:
        """6j symbol: `j1` to `j6`."""
        return self._get("/v1/angular/6j", asked, angular.SymbolAnswered)

    def sweep(self, **asked: Any) -> sweep.SweepAnswered:
        """Sublevels or components over a grid: `atom`, `level` or `line`, `fields`, `columns`."""
        return self._post("sweep", asked, sweep.SweepAnswered)

    def plan(self, **asked: Any) -> PlanAnswered:
        """A frequency plan: `wanted`, `locks`, `modulators`, `max_chain`."""
        return self._post("plan", asked, PlanAnswered)

    def scheme(self, **asked: Any) -> SchemeAnswered:
        """A scheme checked: `atom`, `field`, `beams`, `target`."""
        return self._post("scheme", asked, SchemeAnswered)

    def scan(self, **asked: Any) -> scan.ScanAnswered:
        """A scheme over a grid: `atom`, `field`, `beams`, `axes`, `columns`."""
        return self._post("scan", asked, scan.ScanAnswered)

    def evolution(self, **asked: Any) -> evolution.EvolutionAnswered:
        """Populations of a scheme against time: `atom`, `field`, `beams`, `initial`, `times`."""
        return self._post("evolution", asked, evolution.EvolutionAnswered)

    def remedies(self, **asked: Any) -> remedies.RemediesAnswered:
        """What ends a dark state: `atom`, `field`, `beams`, `magnitudes`, `angles`."""
        return self._post("remedies", asked, remedies.RemediesAnswered)

    def trapcheck(self, **asked: Any) -> trapcheck.TrapcheckAnswered:
        """Whether beams trap and cool in a field gradient: `atom`, `gradient`, `beams`."""
        return self._post("trapcheck", asked, trapcheck.TrapcheckAnswered)

    def geometry(self, **asked: Any) -> geometry.GeometryAnswered:
        """Polarisations of beams along the field, and wave plates: `field`, `beams`."""
        return self._post("geometry", asked, geometry.GeometryAnswered)

    def findings(self) -> findings.FindingsAnswered:
        """Every kind of finding that a scheme may have."""
        return self._get("/v1/findings", {}, findings.FindingsAnswered)

    def scan_lines(self, **asked: Any) -> Iterator[dict[str, Any]]:
        """The lines of a scan as they come, each with its `type`: meta, row, progress, end. Leaving ends the scan."""
        with self._http.stream("POST", "/v1/scan", json={**asked, "format": "ndjson"}) as answer:
            if answer.status_code != 200:
                raise Refused(ProblemBody.model_validate_json(answer.read()))
            kind = ""
            for text in answer.iter_lines():
                line = json.loads(text)
                kind = line["type"]
                if kind == "error":
                    raise Refused(ProblemBody.model_validate({**line, "type": line["problem"]}))
                yield line
            if kind != "end":
                raise ConnectionError("the scan was cut off")

    def _get(self, path: str, asked: dict[str, Any], model: type[Answer]) -> Answer:
        params = {key: str(value) for key, value in asked.items() if value is not None}
        return _read(self._http.get(path, params=params), model)

    def _post(self, name: str, asked: dict[str, Any], model: type[Answer]) -> Answer:
        return _read(self._http.post(f"/v1/{name}", json=asked), model)


def _element(name: str) -> str:
    return f"/v1/elements/{quote(name, safe='')}"


def _atom(name: str) -> str:
    return f"/v1/atoms/{quote(name, safe='')}"


def _read(response: httpx2.Response, model: type[Answer]) -> Answer:
    if response.status_code != 200:
        raise Refused(ProblemBody.model_validate_json(response.content))
    return model.model_validate_json(response.content)
