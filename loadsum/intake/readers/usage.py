"""What the entries of an ESPI feed mean: usage points, reading types, channels -> average power."""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from loadsum.errors import Fault, InputError
from loadsum.intake.findings import Finding
from loadsum.intake.readers.delimited import customer_of_file
from loadsum.intake.readers.espi import Block, Entry, parse_espi
from loadsum.intake.readers.netting import Flow, netted
from loadsum.intake.registers import differences
from loadsum.intake.timed import Timed, joined, left_out, picked
from loadsum.study.tables import MeterFiles

# Codes of espiDerived.xsd 0.7.20190206 (provenance: read in a restatement; names of other commodities: memory).
ENERGY, POWER, REACTIVE_ENERGY, REACTIVE_POWER = 72, 38, 73, 63
USABLE = {ENERGY: "Wh", POWER: "W", REACTIVE_ENERGY: "varh", REACTIVE_POWER: "var"}
ELECTRICITY = (1, 2)
COMMODITIES = {3: "communication", 7: "natural gas", 8: "propane", 9: "water", 10: "steam", 11: "waste water"}
SERVICES = {"1": "gas", "2": "water", "3": "time", "4": "heat"}
DELTA, REGISTER = 4, 1
FORWARD, NET, REVERSE, TOTAL = 1, 4, 19, 20
ESTIMATED = (7, 8, 9, 10, 11, 13)  # edited, estimated, interpolated, questionable, derived, mixed
REJECTED = (12, 15)  # projected, weather-normalised: never measured
UNITS_WH = {"Wh": 1.0, "kWh": 1e3, "MWh": 1e6, "W": 1.0, "kW": 1e3, "MW": 1e6}


@dataclass(frozen=True, slots=True, kw_only=True)
class Kind:
    """What the values of a channel are, as its ReadingType or the study file says."""

    unit: int
    scale: float
    register: bool
    sign: float
    interval_s: float
    quality: float
    stated: bool


def read_espi(
    content: bytes, name: str, source: MeterFiles, findings: list[Finding], choices: list[str]
) -> tuple[Timed, int]:
    """Readings of one ESPI feed, netted, and how many there are in it.

    Starts are instants in UTC by the standard, so no time zone is needed. A channel without a ReadingType is read as
    the study file states under [[readings]].

    Raises
    ------
    InputError
        The feed is no ESPI XML, or is about something other than electricity.
    """
    entries = parse_espi(content, name)
    blocks = [entry for entry in entries if entry.blocks]
    if not blocks:
        raise InputError(name, [Fault(name, "holds no IntervalBlock with readings")])
    meters = [entry for entry in entries if entry.kind == "MeterReading"]
    kinds = [entry for entry in entries if entry.kind == "ReadingType"]
    points = [entry for entry in entries if entry.kind == "UsagePoint"]
    _only_electricity(points, name)
    channels: dict[tuple[str, str], list[Block]] = {}
    said: dict[tuple[str, str], Kind | None] = {}
    for entry in blocks:
        meter = _parent(entry, meters)
        customer = _customer(meter or entry, points, name, source)
        kind = _reading_type(meter, kinds)
        key = (customer, meter.own if meter is not None else "")
        channels.setdefault(key, []).extend(entry.blocks)
        said[key] = _kind(kind, source, name) if key not in said else said[key]
    customers = sorted({customer for customer, _ in channels})
    flows: dict[str, list[Flow]] = {customer: [] for customer in customers}
    rows = 0
    for (customer, own), parts in channels.items():
        kind_of = said[customer, own]
        count = sum(block.value.size for block in parts)
        if kind_of is None:
            rows += count
            findings.append(_unused(name, customer, count))
            continue
        part = _timed(parts, kind_of, customers, customers.index(customer), name, findings)
        rows += count - part.kw.size
        if part.kw.size:
            reactive = kind_of.unit in (REACTIVE_ENERGY, REACTIVE_POWER)
            flows[customer].append(Flow(sign=kind_of.sign, reactive=reactive, readings=part))
        if not kind_of.stated:
            choices.append(f"{customer}: no ReadingType; {source.quantity} in {source.unit}, as the study file states")
    done = []
    for customer in customers:
        if not any(not flow.reactive for flow in flows[customer]):
            rows += sum(flow.readings.kw.size for flow in flows[customer])
            findings.extend(
                _unused(name, customer, flow.readings.kw.size) for flow in flows[customer] if flow.readings.kw.size
            )
            continue
        kept, coarse = _merged(flows[customer])
        for flow in coarse:
            rows += flow.readings.kw.size
            findings.append(_unused(name, customer, flow.readings.kw.size))
        part, number = netted(kept, findings)
        rows += number
        done.append(part)
    choices.append("starts in UTC; unit, multiplier and direction by each ReadingType")
    if not done:
        raise InputError(name, [Fault(name, "holds no channel of energy or power")])
    return joined(done), rows


def _merged(flows: list[Flow]) -> tuple[list[Flow], list[Flow]]:
    """Channels of the finest interval, those of one direction as one; and the coarser ones, which repeat them."""
    length = [float(np.median(flow.readings.minutes)) for flow in flows]
    finest = min(minutes for flow, minutes in zip(flows, length, strict=True) if not flow.reactive)
    kept: dict[tuple[float, bool], list[Timed]] = {}
    coarse = []
    for flow, minutes in zip(flows, length, strict=True):
        if minutes == finest:
            kept.setdefault((flow.sign, flow.reactive), []).append(flow.readings)
        else:
            coarse.append(flow)
    merged = [Flow(sign=sign, reactive=reactive, readings=joined(parts)) for (sign, reactive), parts in kept.items()]
    return merged, coarse


def _unused(name: str, customer: str, count: int) -> Finding:
    return Finding(
        rule="channel not used",
        severity="excluded",
        customer=customer,
        place=name,
        count=count,
        excluded=count,
        message=f"{count} value(s) of a channel that is no interval energy or power of one direction",
        effect="left aside",
    )


def _only_electricity(points: list[Entry], name: str) -> None:
    for point in points:
        kind = point.fields.get("serviceCategory", "0")
        if kind != "0":
            what = SERVICES.get(kind, f"service {kind}")
            raise InputError(name, [Fault(name, f"usage point {_last(point.own)!r} is of {what}, not electricity")])


def _parent(entry: Entry, meters: list[Entry]) -> Entry | None:
    for meter in meters:
        under = meter.own + "/"
        if meter.own and any((link + "/").startswith(under) for link in (entry.own, entry.up) if link):
            return meter
        if entry.own in meter.related or (entry.up and entry.up in meter.related):
            return meter
    return meters[0] if len(meters) == 1 else None


def _customer(entry: Entry, points: list[Entry], name: str, source: MeterFiles) -> str:
    link = entry.own or entry.up
    if "/UsagePoint/" in link:
        own = link.split("/UsagePoint/", 1)[1].split("/")[0]
    else:
        own = _last(points[0].own) if len(points) == 1 else ""
    alone = len(points) <= 1
    stated = customer_of_file(name, source)
    if stated and alone:
        return stated
    if not own:
        raise InputError(
            name,
            [Fault("readings.customer", f"{name} does not say which usage point its readings belong to; state it")],
        )
    return own


def _last(link: str) -> str:
    return link.rsplit("/", 1)[-1]


def _reading_type(meter: Entry | None, kinds: list[Entry]) -> Entry | None:
    if meter is not None:
        for kind in kinds:
            if kind.own and kind.own in meter.related:
                return kind
        if any("ReadingType" in link for link in meter.related) and len(kinds) != 1:
            return None
    return kinds[0] if len(kinds) == 1 else None


def _kind(entry: Entry | None, source: MeterFiles, name: str) -> Kind | None:
    """Meaning of a reading type; None where it is no interval energy or power."""
    if entry is None:
        return Kind(
            unit=POWER if source.quantity == "power" else ENERGY,
            scale=UNITS_WH[source.unit] * source.multiplier,
            register=source.quantity == "register",
            sign=1.0,
            interval_s=source.interval_min * 60.0,
            quality=float("nan"),
            stated=False,
        )

    def code(key: str, absent: int) -> int:
        text = entry.fields.get(key, "")
        if text and not text.lstrip("+-").isdigit():
            raise InputError(name, [Fault(name, f"ReadingType.{key} is {text[:20]!r}, not a code")])
        return int(text) if text else absent

    commodity = code("commodity", 1)
    if commodity not in ELECTRICITY and commodity != 0:
        what = COMMODITIES.get(commodity, f"commodity {commodity}")
        raise InputError(name, [Fault(name, f"is about {what}, not electricity")])
    accumulation, unit, direction = code("accumulationBehaviour", DELTA), code("uom", 0), code("flowDirection", FORWARD)
    power = code("powerOfTenMultiplier", 0)
    if not -12 <= power <= 12:
        raise InputError(name, [Fault(name, f"ReadingType.powerOfTenMultiplier is {power}")])
    if unit not in USABLE or direction == TOTAL or accumulation not in (DELTA, REGISTER, 12):
        return None
    if accumulation == 12 and unit != POWER:
        return None
    return Kind(
        unit=unit,
        scale=10.0**power * source.multiplier,
        register=accumulation == REGISTER,
        sign=-1.0 if direction == REVERSE else 1.0,
        interval_s=float(code("intervalLength", 0)),
        quality=float(code("defaultQuality", -1)),
        stated=True,
    )


def _timed(
    blocks: list[Block], kind: Kind, customers: list[str], code: int, name: str, findings: list[Finding]
) -> Timed:
    start, duration, value, quality, line = [], [], [], [], []
    for block in blocks:
        length = np.where(np.isnan(block.duration_s), kind.interval_s, block.duration_s)
        follow = block.begin_s + np.concatenate([[0.0], np.cumsum(length)[:-1]])
        begin = np.where(np.isnan(block.start_s), follow, block.start_s)
        if kind.register:
            length = np.full(begin.size, kind.interval_s or np.nan)
        start.append(begin)
        duration.append(length)
        value.append(block.value)
        quality.append(np.where(np.isnan(block.quality), kind.quality, block.quality))
        line.append(np.arange(block.first, block.first + begin.size))
    starts, lengths, marks = np.concatenate(start), np.concatenate(duration), np.concatenate(quality)
    if kind.register and np.isnan(lengths).any():
        lengths = np.full(starts.size, _common_step(starts))
    bad = ~(np.isfinite(starts) & (lengths > 0.0) & (np.mod(lengths, 60.0) == 0.0) & (starts > 0.0) & (starts < 4.2e9))
    empty = np.isnan(np.concatenate(value))
    part = Timed(
        name=name,
        customers=tuple(customers),
        customer=np.full(starts.size, code, dtype=np.int32),
        start_s=np.where(bad, 0.0, starts).astype(np.int64),
        minutes=np.where(bad, 60.0, lengths / 60.0).astype(np.int64),
        kw=np.concatenate(value) * kind.scale,
        kvar=None,
        estimated=np.isin(marks, ESTIMATED),
        line=np.concatenate(line),
    )
    rejected = np.isin(marks, REJECTED) & ~bad & ~empty
    for chosen, rule, what in (
        (bad, "unreadable stamp", "have no start or length of whole minutes"),
        (empty & ~bad, "empty reading", "hold no value"),
        (rejected, "not measured", "are projected or weather-normalised, not measured"),
    ):
        findings.extend(left_out(part, chosen, rule, f"reading(s) {what}", "they are left out"))
    part = picked(part, ~(bad | empty | rejected))
    if kind.register:
        part = differences(part, 0, findings)
    hours = part.minutes / 60.0 if kind.unit in (ENERGY, REACTIVE_ENERGY) else 1.0
    return replace(part, kw=part.kw / (1e3 * hours))


def _common_step(starts: NDArray[np.float64]) -> float:
    steps, count = np.unique(np.diff(np.unique(starts)), return_counts=True)
    return float(steps[np.argmax(count)]) if steps.size else float("nan")
