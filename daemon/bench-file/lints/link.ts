import type { Bench } from "../../model/bench.ts";
import { formatQuantity } from "../../model/quantities.ts";
import type { Finding } from "../problem.ts";
import { error, warning } from "./finding.ts";

/** Ten bits carry a byte: start bit, eight data bits, stop bit. */
const BITS_PER_BYTE = 10;
/** A sample line of eight channels with every counter at its longest. */
export const SAMPLE_BYTES = 110;
/** A permit line with every field at its longest, and room for one answer now and then. */
export const PERMIT_BYTES = 55;
/** A permit follows the one before by at least this much of the controller's time. */
export const PERMIT_GAP_ms = 50;
/** Shares of the line that samples and permits may fill; the rest is for answers and repeats. */
export const UP_SHARE_MAX = 0.6;
export const DOWN_SHARE_MAX = 0.3;
/** A term outlives four lost permits. */
const PERIODS_PER_TERM = 5;

/** What was measured on this very bench, where anything was. */
export interface Measured {
  /** The worst age of a permit on its arrival at the board, ms; null where nobody measured it. */
  readonly permitAge_ms: number | null;
}

export function lintLink(bench: Bench, measured: Measured): Finding[] {
  const term = lintTerm(bench);
  const age = term.length > 0 ? [] : lintAge(bench, measured);
  return [...term, ...age, ...lintWire(bench), ...lintSlew(bench)];
}

function lintAge({ controller }: Bench, { permitAge_ms }: Measured): Finding[] {
  if (permitAge_ms === null) return [];
  const { term_ms, rate_perS } = controller;
  const wanted_ms = PERIODS_PER_TERM * permitPeriod_ms(rate_perS) + permitAge_ms;
  if (term_ms >= wanted_ms) return [];
  return [
    warning("term-age", ["controller", "term"], {
      found: `${formatQuantity("time", term_ms)}, and permits that arrived ${formatQuantity("time", permitAge_ms)} old`,
      wanted: `${formatQuantity("time", Math.ceil(wanted_ms))} or more: five permits and the worst age measured`,
      do: "write a longer term, or find out what delays the line",
    }),
  ];
}

/** The judge shall see a rise while it goes on. */
function lintSlew({ controller, limits }: Bench): Finding[] {
  const period_ms = permitPeriod_ms(controller.rate_perS);
  const rise_mA = (limits.slewUp_mAperS * period_ms) / 1000;
  if (rise_mA < limits.current_mA) return [];
  const most = Math.floor((limits.current_mA * 1000) / period_ms);
  return [
    warning("slew-fast", ["limits", "slew-up"], {
      found: `a rise of ${formatQuantity("current", rise_mA)} from one permit to the next`,
      wanted: `less than the limit of ${formatQuantity("current", limits.current_mA)}`,
      do: `write less than ${formatQuantity("slew", most)}; a tenth of it is calm`,
    }),
  ];
}

/** Time between permits: the first sample that is late enough. */
export function permitPeriod_ms(rate_perS: number): number {
  const period_ms = 1000 / rate_perS;
  return Math.ceil(PERMIT_GAP_ms / period_ms - 1e-9) * period_ms;
}

function lintTerm({ controller }: Bench): Finding[] {
  const { term_ms, rate_perS } = controller;
  const least_ms = (PERIODS_PER_TERM * 1000) / rate_perS;
  const found = `${formatQuantity("time", term_ms)} at ${formatQuantity("rate", rate_perS)}`;
  if (term_ms < least_ms) {
    const rate = formatQuantity("rate", Math.ceil((PERIODS_PER_TERM * 1000) / term_ms));
    return [
      error("term-short", ["controller", "term"], {
        found,
        wanted: `a term of at least five sample periods, ${formatQuantity("time", least_ms)} here, so that a few lost samples do not end light`,
        do: `write a longer term, or a rate of ${rate} or more`,
      }),
    ];
  }
  const calm_ms = PERIODS_PER_TERM * permitPeriod_ms(rate_perS);
  if (term_ms >= calm_ms) return [];
  return [
    warning("term-tight", ["controller", "term"], {
      found,
      wanted: `five permits in a term, ${formatQuantity("time", calm_ms)} here, because permits are at least ${PERMIT_GAP_ms} ms apart`,
      do: "write a longer term, unless the bench needs so short a one",
    }),
  ];
}

/** Shares of the line used upward and downward; zero where the transport has no line rate. */
export function wireShares({ controller }: Bench): { up: number; down: number } {
  const { transport, rate_perS } = controller;
  if (transport.kind !== "serial") return { up: 0, down: 0 };
  const permits_perS = 1000 / permitPeriod_ms(rate_perS);
  return {
    up: (SAMPLE_BYTES * BITS_PER_BYTE * rate_perS) / transport.baud,
    down: (PERMIT_BYTES * BITS_PER_BYTE * permits_perS) / transport.baud,
  };
}

function lintWire(bench: Bench): Finding[] {
  const { up, down } = wireShares(bench);
  const { transport, rate_perS } = bench.controller;
  if (transport.kind !== "serial") return [];
  const findings: Finding[] = [];
  const rate = formatQuantity("rate", rate_perS);
  const baud = formatQuantity("baud", transport.baud);
  if (up > UP_SHARE_MAX) {
    const most = Math.floor((UP_SHARE_MAX * transport.baud) / (SAMPLE_BYTES * BITS_PER_BYTE));
    findings.push(
      error("wire-up", ["controller", "rate"], {
        found: `${rate} at ${baud}: samples fill ${formatQuantity("ratio", up)} of the line`,
        wanted: `at most ${formatQuantity("ratio", UP_SHARE_MAX)}, or samples queue and arrive late`,
        do: `write a rate of ${formatQuantity("rate", most)} or less, or raise the line rate of board and file`,
      }),
    );
  }
  if (down > DOWN_SHARE_MAX) {
    findings.push(
      error("wire-down", ["controller", "connect", "baud"], {
        found: `${baud}: permits fill ${formatQuantity("ratio", down)} of the line`,
        wanted: `at most ${formatQuantity("ratio", DOWN_SHARE_MAX)}, so that dark never waits behind a permit`,
        do: "raise the line rate of board and file, or lower the rate of samples",
      }),
    );
  }
  return findings;
}
