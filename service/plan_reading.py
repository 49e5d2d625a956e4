"""Reads a plan's request: names become records, records become optical frequencies and modulators."""

from levels.errors import OutsideValidity
from levels.locks import BEAT, COMB, DEFAULT_SPAN_MHZ, FEATURE, Lock, Point, Wanted, check_point, point_of_place
from levels.modulators import HARMONIC, Modulator, check_modulator
from levels.moves import Earlier
from levels.notation import parse_component, parse_feature
from levels.plan import Order
from levels.positions import Place, place, place_of_centroid, place_of_feature
from levels.records import Line
from levels.sharing import Share
from service.context import Context
from service.plan_shapes import LockAsked, ModulatorAsked, PlanAsked, WantedAsked


def order_of(context: Context, asked: PlanAsked) -> tuple[Order, list[Line]]:
    """The plan as the library takes it, and the lines that its frequencies rest on."""
    lines: list[Line] = []
    wanted = tuple(_wanted(context, one, lines) for one in asked.wanted)
    locks = tuple(_lock(context, one, lines) for one in asked.locks)
    order = Order(
        wanted,
        locks,
        tuple(_modulator(one) for one in asked.modulators),
        asked.max_chain,
        asked.tolerance,
        tuple(Share(tuple(one.wanted), one.modulator or "") for one in asked.share),
        asked.alternatives,
        {one.wanted: one.structure for one in earlier_of(asked)},
    )
    return order, list({(line.atom, line.name): line for line in lines}.values())


def earlier_of(asked: PlanAsked) -> list[Earlier]:
    """The settings of the earlier plan, where there is one."""
    if asked.previous is None:
        return []
    return [
        Earlier(
            one.wanted,
            one.frequency_MHz,
            one.lock,
            one.lock_light_MHz,
            one.beat_MHz,
            tuple((part.modulator, part.order, part.frequency_MHz) for part in one.elements),
        )
        for one in asked.previous.settings
    ]


def _line(context: Context, owner: str, atom: str | None, name: str | None, lines: list[Line]) -> Line:
    if atom is None or name is None:
        missing = "atom" if atom is None else "line"
        raise OutsideValidity(f"{owner} {missing}", "", "an atom and a line, or a frequency")
    line = context.line(atom, name)
    if line.photons != 1:
        raise OutsideValidity(f"{owner} line", line.name, "a one-photon line; state the laser's frequency instead")
    lines.append(line)
    return line


def _wanted(context: Context, asked: WantedAsked, lines: list[Line]) -> Wanted:
    owner = f"wanted {asked.name}"
    if asked.frequency is not None:
        if asked.atom or asked.line or asked.component or asked.lower or asked.upper:
            raise OutsideValidity(f"{owner} frequency", asked.frequency, "either a frequency or an atom and line")
        light = check_point(f"{owner} frequency", asked.frequency + asked.detuning)
        return Wanted(asked.name, Point(light, None), tuple(asked.locks))
    line = _line(context, owner, asked.atom, asked.line, lines)
    point = point_of_place(_place(owner, line, asked), asked.detuning, asked.lower is not None)
    check_point(f"{owner} frequency", point.frequency_mhz)
    return Wanted(asked.name, point, tuple(asked.locks))


def _place(owner: str, line: Line, asked: WantedAsked) -> Place:
    if asked.lower is not None or asked.upper is not None:
        if asked.lower is None or asked.upper is None or asked.component is not None:
            raise OutsideValidity(owner, asked.component or "", "both lower and upper, without component")
        return place(line, [asked.lower], [asked.upper], asked.field)
    if asked.field:
        raise OutsideValidity(f"{owner} field", asked.field, "lower and upper sublevels, which a field needs")
    if asked.component is None:
        return place_of_centroid(line)
    low_F, up_F = parse_component(asked.component, f"{owner} component")
    return place(line, [(low_F, None)], [(up_F, None)])


def _lock(context: Context, asked: LockAsked, lines: list[Line]) -> Lock:
    owner = f"lock {asked.name}"
    beat = _beat(owner, asked)
    if asked.kind == BEAT:
        if asked.beat_with is None or beat is None:
            raise OutsideValidity(owner, asked.beat_with or "", "beat_with, beat_low and beat_high")
        return Lock(asked.name, BEAT, None, None, beat, asked.beat_with)
    if asked.kind == FEATURE:
        line = _line(context, owner, asked.atom, asked.line, lines)
        where = place_of_centroid(line) if asked.feature is None else _feature(owner, line, asked.feature)
        return Lock(asked.name, FEATURE, point_of_place(where), None, beat)
    if asked.frequency is None:
        raise OutsideValidity(f"{owner} frequency", "", "the frequency, of a comb that of any one line")
    if asked.kind == COMB and not asked.spacing:
        raise OutsideValidity(f"{owner} spacing", asked.spacing, "the distance of the comb's lines, above 0")
    point = Point(check_point(f"{owner} frequency", asked.frequency), asked.uncertainty)
    spacing = asked.spacing if asked.kind == COMB else None
    span = DEFAULT_SPAN_MHZ if asked.span is None else asked.span
    return Lock(asked.name, asked.kind, point, spacing, beat, span_mhz=span)


def _feature(owner: str, line: Line, text: str) -> Place:
    return place_of_feature(line, parse_feature(text, f"{owner} feature"))


def _beat(owner: str, asked: LockAsked) -> tuple[float, float] | None:
    if asked.beat_low is None and asked.beat_high is None:
        return None
    low, high = asked.beat_low, asked.beat_high
    if low is None or high is None or low > high:
        raise OutsideValidity(f"{owner} beat_low", low, "beat_low and beat_high, the lower first")
    return low, high


def _modulator(asked: ModulatorAsked) -> Modulator:
    owner = f"modulator {asked.name}"
    if asked.kind == HARMONIC:
        return check_modulator(Modulator(asked.name, HARMONIC, factor=asked.factor, place=asked.place))
    if asked.low is not None and asked.high is not None and asked.centre is None and asked.bandwidth is None:
        low, high = asked.low, asked.high
    elif asked.centre is not None and asked.bandwidth is not None and asked.low is None and asked.high is None:
        low, high = asked.centre - asked.bandwidth / 2, asked.centre + asked.bandwidth / 2
    else:
        raise OutsideValidity(f"{owner} range", "", "either centre and bandwidth, or low and high")
    return check_modulator(
        Modulator(asked.name, asked.kind, low, high, tuple(asked.orders), asked.passes, 1, asked.step, asked.place)
    )
