import type { Bench, DeratingPoint } from "../../model/bench.ts";
import { formatQuantity } from "../../model/quantities.ts";
import { crystalFloor_mA } from "../../physics/crystal.ts";
import { heat_mW, junctionLimited_mA, slope_mWpermA, threshold_mA } from "../../physics/diode.ts";
import { loopGain, settle } from "../../physics/thermal.ts";
import type { Finding } from "../problem.ts";
import { error, warning } from "./finding.ts";

/** A hardware clamp sits this far above the largest current in use. */
const CLAMP = 1.1;
/** A room as people work in it, for asking where the case would settle. */
const ROOM_degC = 25;

const mA = (value: number): string => formatQuantity("current", value);
const degC = (value: number): string => formatQuantity("temperature", value);

export function lintCurrents(bench: Bench): Finding[] {
  const order = lintOrder(bench.derating);
  // A derating out of order has no meaning, so nothing more is said about it.
  const rest =
    order.length > 0
      ? []
      : [...lintThreshold(bench), ...lintJunction(bench), ...lintReach(bench), ...lintCool(bench)];
  return [...lintAbsolute(bench), ...order, ...rest, ...lintLoop(bench)];
}

/** A limit above the derating limits nothing; a derating that ends early trips before its row. */
function lintReach({ derating, limits, hazards, diode }: Bench): Finding[] {
  const findings: Finding[] = [];
  const most_mA = derating[0]?.current_mA ?? 0;
  const isAllowed = limits.current_mA <= diode.absolute_mA;
  if (isAllowed && limits.current_mA > most_mA && most_mA > 0) {
    findings.push(
      warning("limit-idle", ["limits", "current"], {
        found: `${mA(limits.current_mA)}, and a derating that allows ${mA(most_mA)} at most`,
        wanted: "a limit that the bench can reach",
        do: `write ${mA(most_mA)} or less, or a higher derating`,
      }),
    );
  }
  const last = derating[derating.length - 1];
  const { trip } = hazards["case-over"];
  if (last !== undefined && trip !== null && last.case_degC < trip) {
    findings.push(
      warning("derating-ends-early", ["derating", derating.length - 1, "case"], {
        found: `${degC(last.case_degC)}, beyond which no current is allowed`,
        wanted: `a last point at ${degC(trip)}, where hazards.case-over trips`,
        do: "add a point there, or write a lower trip of hazards.case-over",
      }),
    );
  }
  return findings;
}

/** A case that settles at its trip level in an ordinary room cannot hold the limit. */
function lintCool({ cooling, diode, limits, hazards }: Bench): Finding[] {
  const { trip } = hazards["case-over"];
  if (cooling === null || trip === null) return [];
  const heat_W = heat_mW(diode, limits.current_mA, ROOM_degC) / 1000;
  const at = { case_degC: Number.NaN, sink_degC: Number.NaN };
  settle(cooling, heat_W, ROOM_degC, at);
  if (!(at.case_degC >= trip)) return [];
  return [
    warning("cooling-weak", ["cooling", "sink-to-room"], {
      found: `a case that settles at ${degC(at.case_degC)} with ${mA(limits.current_mA)} in a room of ${degC(ROOM_degC)}`,
      wanted: `a case below ${degC(trip)}, where hazards.case-over trips`,
      do: "cool better, or write a lower limits.current",
    }),
  ];
}

function lintAbsolute({ limits, diode, derating }: Bench): Finding[] {
  const findings: Finding[] = [];
  const most = mA(diode.absolute_mA);
  if (limits.current_mA > diode.absolute_mA) {
    findings.push(
      error("over-absolute", ["limits", "current"], {
        found: mA(limits.current_mA),
        wanted: `at most the diode's absolute maximum of ${most}`,
        do: `write ${most} or less`,
      }),
    );
  } else if (limits.current_mA * CLAMP > diode.absolute_mA) {
    findings.push(
      warning("no-room-for-clamp", ["limits", "current"], {
        found: `${mA(limits.current_mA)} under an absolute maximum of ${most}`,
        wanted: "room for a hardware clamp at 110 % of the limit, for what is faster than 10 ms",
        do: `write ${mA(Math.floor(diode.absolute_mA / CLAMP / 10) * 10)} or less`,
      }),
    );
  }
  derating.forEach((point, n) => {
    if (point.current_mA <= diode.absolute_mA) return;
    findings.push(
      error("over-absolute", ["derating", n, "current"], {
        found: `${mA(point.current_mA)} at ${degC(point.case_degC)}`,
        wanted: `at most the diode's absolute maximum of ${most}`,
        do: `write ${most} or less`,
      }),
    );
  });
  return findings;
}

function lintOrder(derating: readonly DeratingPoint[]): Finding[] {
  const findings: Finding[] = [];
  derating.forEach((point, n) => {
    const before = derating[n - 1];
    if (before === undefined) return;
    if (point.case_degC <= before.case_degC) {
      findings.push(
        error("derating-order", ["derating", n, "case"], {
          found: `${degC(point.case_degC)} after ${degC(before.case_degC)}`,
          wanted: "points from the coolest case to the warmest",
          do: "put the points in order, each temperature once",
        }),
      );
    }
    if (point.current_mA > before.current_mA) {
      findings.push(
        error("derating-rises", ["derating", n, "current"], {
          found: `${mA(point.current_mA)} at ${degC(point.case_degC)}, more than ${mA(before.current_mA)} at ${degC(before.case_degC)}`,
          wanted: "a current that never rises as the case warms",
          do: `write ${mA(before.current_mA)} or less`,
        }),
      );
    }
  });
  return findings;
}

/** The least of derating and bench limit at a point. */
const allowed_mA = (bench: Bench, point: DeratingPoint): number =>
  Math.min(point.current_mA, bench.limits.current_mA);

/** A bench whose ceiling is under its floor where it is coolest can never emit. */
function lintThreshold(bench: Bench): Finding[] {
  const { diode, crystal, derating } = bench;
  const findings: Finding[] = [];
  derating.forEach((point, n) => {
    const ceiling = allowed_mA(bench, point);
    const start = threshold_mA(diode, point.case_degC);
    if (point.current_mA === 0 || ceiling >= start) return;
    const say = n === 0 ? error : warning;
    findings.push(
      say("under-threshold", ["derating", n, "current"], {
        found: `a ceiling of ${mA(ceiling)} at ${degC(point.case_degC)}, where threshold is ${mA(start)}`,
        wanted: "a ceiling above threshold: below it there is no laser light",
        do: "check the derating, limits.current and diode.threshold for a wrong unit",
      }),
    );
  });
  const first = derating[0];
  if (crystal === null || first === undefined || findings.length > 0) return findings;
  const ceiling = allowed_mA(bench, first);
  if (crystalFloor_mA(diode, crystal, first.case_degC, ceiling) > ceiling) {
    findings.push(
      error("crystal-dark", ["crystal", "threshold"], {
        found: `a crystal that does not lase at ${mA(ceiling)} and ${degC(first.case_degC)}`,
        wanted: "a crystal that lases under the ceiling",
        do: "check crystal.threshold, crystal.line and diode.wavelength against each other",
      }),
    );
  }
  return findings;
}

function lintJunction(bench: Bench): Finding[] {
  for (const [n, point] of bench.derating.entries()) {
    const limit = junctionLimited_mA(bench.diode, point.case_degC);
    const ceiling = allowed_mA(bench, point);
    if (limit >= ceiling) continue;
    return [
      warning("junction-first", ["derating", n, "current"], {
        found: `${mA(ceiling)} at ${degC(point.case_degC)}, where the junction limit is ${mA(limit)}`,
        wanted: "a derating under the junction limit, which counts all power as heat",
        do: `write ${mA(Math.floor(limit / 10) * 10)} or less, or leave it: the junction then makes the ceiling`,
      }),
    ];
  }
  return [];
}

/** Ceiling and current form a loop through heat; above a gain of 1 a capped bench hunts. */
function lintLoop(bench: Bench): Finding[] {
  const { cooling, diode, derating } = bench;
  if (cooling === null || diode.v0_mV === null || diode.rs_ohm === null) return [];
  const findings: Finding[] = [];
  for (const [n, point] of derating.entries()) {
    const before = derating[n - 1];
    if (before === undefined || point.case_degC <= before.case_degC) continue;
    // Where the bench limit is lower, the derating's fall does not move the ceiling.
    if (point.current_mA >= bench.limits.current_mA) continue;
    const fall = (before.current_mA - point.current_mA) / (point.case_degC - before.case_degC);
    const middle_mA = (before.current_mA + point.current_mA) / 2;
    const middle_degC = (before.case_degC + point.case_degC) / 2;
    const light_mV = 1000 * slope_mWpermA(diode, middle_degC);
    const heat_mV = diode.v0_mV + 2 * diode.rs_ohm * middle_mA - light_mV;
    const toRoom = cooling.caseToSink_KperW + cooling.sinkToRoom_KperW;
    const gain = loopGain(fall, toRoom, heat_mV);
    if (gain <= 1) continue;
    findings.push(
      warning("hunts", ["derating", n, "current"], {
        found: `a fall of ${formatQuantity("current", fall, 1)} a kelvin, a loop gain of ${gain.toFixed(1)}`,
        wanted: "a loop gain under 1: above it a capped current swings instead of settling",
        do: "spread the fall over more kelvin, or cool the case better",
      }),
    );
  }
  return findings;
}
