import type { Bench } from "../../model/bench.ts";
import { HAZARD_IDS } from "../../model/bench.ts";
import { HAZARD_ROWS } from "../../model/hazard-rows.ts";
import { channelNamed, type Manifest } from "../../model/manifest.ts";
import { formatQuantity } from "../../model/quantities.ts";
import { lawToUnit } from "../../physics/convert.ts";
import type { Finding } from "../problem.ts";
import { error, warning } from "./finding.ts";

/** What only shows once a board has introduced itself: whether it can do what the bench file asks. */
export function lintManifest(bench: Bench, manifest: Manifest): Finding[] {
  return [
    ...lintBoard(bench, manifest),
    ...lintBlindRows(bench, manifest),
    ...lintCaseReach(bench, manifest),
  ];
}

function lintBoard(bench: Bench, manifest: Manifest): Finding[] {
  const { controller } = bench;
  const findings: Finding[] = [];
  if (manifest.rate_perS < controller.rate_perS) {
    findings.push(
      error("board-slow", ["controller", "rate"], {
        found: `a board that sends ${formatQuantity("rate", manifest.rate_perS)}`,
        wanted: `at least the ${formatQuantity("rate", controller.rate_perS)} of the bench file`,
        do: "lower controller.rate (check then tells which rows suffer), or raise the board's",
      }),
    );
  }
  const tick_ms = manifest.tick_us / 1000;
  const least = manifest.term_ticks_min * tick_ms;
  const most = manifest.term_ticks_max * tick_ms;
  if (controller.term_ms < least || controller.term_ms > most) {
    findings.push(
      error("board-term", ["controller", "term"], {
        found: formatQuantity("time", controller.term_ms),
        wanted: `${formatQuantity("time", least)} to ${formatQuantity("time", most)}, as the board allows`,
        do: "write a term in this range",
      }),
    );
  }
  if (bench.protections.toggledEnable && !manifest.capabilities.includes("toggle")) {
    findings.push(
      warning("board-toggle", ["protections", "toggled-enable"], {
        found: "yes, and a board that does not toggle its enable",
        wanted: "a board whose enable is a toggled line",
        do: "write no, or load firmware that toggles the enable",
      }),
    );
  }
  return findings;
}

/** Rows in use whose channel the board does not have. */
function lintBlindRows(bench: Bench, manifest: Manifest): Finding[] {
  const findings: Finding[] = [];
  for (const id of HAZARD_IDS) {
    const { warn, trip } = bench.hazards[id];
    if (warn === null && trip === null) continue;
    const missing = HAZARD_ROWS[id].needs.filter((name) => !channelNamed(manifest, name));
    if (missing.length === 0) continue;
    findings.push(
      error("blind", ["hazards", id], {
        found: `a board without the channel ${missing.join(" and ")}`,
        wanted: `what the row ${id} looks at: ${HAZARD_ROWS[id].measures}`,
        do: "add the channel to the board, or write none for warn and trip of this row",
      }),
    );
  }
  return findings;
}

/** Whether the case channel's counts reach the trip level at all. */
function lintCaseReach(bench: Bench, manifest: Manifest): Finding[] {
  const channel = channelNamed(manifest, "case");
  const { trip } = bench.hazards["case-over"];
  if (channel === undefined || trip === null) return [];
  const law = bench.conversions.case?.law ?? {
    kind: "linear",
    perCount: channel.perCount,
    offset: 0,
  };
  const top = Math.max(lawToUnit(law, channel.count_min), lawToUnit(law, channel.count_max));
  if (top > trip) return [];
  return [
    error("sensor-span", ["hazards", "case-over", "trip"], {
      found: `a case channel that reads at most ${formatQuantity("temperature", top)}`,
      wanted: `more than the trip level of ${formatQuantity("temperature", trip)}`,
      do: "change the sensor's range on the board, or lower the trip level",
    }),
  ];
}
