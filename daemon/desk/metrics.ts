import type { FastifyInstance } from "fastify";
import { Gauge, type OpenMetricsContentType, Registry } from "prom-client";
import { type Snapshot, StateName } from "../control/api.ts";
import { proofOf } from "./guarded.ts";
import type { DeskParts } from "./server.ts";

interface Reading {
  readonly name: string;
  readonly help: string;
  /** Null where it is not known at this moment: it is then left out, not told as zero. */
  readonly value: number | null;
}

const scaled = (value: number | null, factor: number): number | null =>
  value === null ? null : value * factor;

/** Health and slow values of a snapshot, in base units, as scrapers want them. */
function readingsOf(snapshot: Snapshot): Reading[] {
  const { link, recorder } = snapshot;
  const reading = (name: string, help: string, value: number | null): Reading => ({
    name,
    help,
    value,
  });
  return [
    reading("current_amperes", "Current measured by the board.", scaled(snapshot.current_mA, 1e-3)),
    reading("ceiling_amperes", "Highest current allowed now.", scaled(snapshot.ceiling_mA, 1e-3)),
    reading(
      "floor_amperes",
      "Current at which it begins to lase.",
      scaled(snapshot.floor_mA, 1e-3),
    ),
    reading("case_celsius", "Temperature of the diode's case.", snapshot.case_degC),
    reading("output_watts", "Output by the photodiode.", scaled(snapshot.output_mW, 1e-3)),
    reading("sample_age_seconds", "Time since the last sample.", scaled(snapshot.age_ms, 1e-3)),
    reading(
      "loop_delay_worst_seconds",
      "Longest delay of a permit, by the board's clock.",
      scaled(link.loopDelayWorst_ms, 1e-3),
    ),
    reading("samples_lost", "Samples missing on the line, since the daemon began.", link.lost),
    reading("lines_garbled", "Lines with a broken checksum, since the daemon began.", link.garbled),
    reading("warnings", "Warnings that stand now.", snapshot.warnings.length),
    reading("recorder_behind_seconds", "Samples not yet recorded.", recorder.behind_ms / 1000),
    reading(
      "recorder_in_trouble",
      "1 while recording fails or has lost something.",
      recorder.words === "" ? 0 : 1,
    ),
  ];
}

/** The page for scrapers, in the OpenMetrics text format. Reads; changes nothing. */
export async function metricsText({ live, line, waiting }: DeskParts): Promise<string> {
  const registry = new Registry<OpenMetricsContentType>();
  registry.setContentType(Registry.OPENMETRICS_CONTENT_TYPE);
  const add = ({ name, help, value }: Reading): void => {
    if (value === null) return;
    const labels = { bench: live.bench };
    const gauge = new Gauge({
      name: `beamsitter_${name}`,
      help,
      labelNames: ["bench"],
      registers: [registry],
    });
    gauge.set(labels, value);
  };
  add({
    name: "connected",
    help: "1 while the judging part answers.",
    value: line.connected ? 1 : 0,
  });
  add({
    name: "second_home_waiting_samples",
    help: "Samples not yet at the second home.",
    value: waiting?.() ?? null,
  });
  const { snapshot } = live;
  if (snapshot !== undefined) {
    for (const reading of readingsOf(snapshot)) add(reading);
    const state = new Gauge({
      name: "beamsitter_state",
      help: "1 for the state the bench is in.",
      labelNames: ["bench", "state"],
      registers: [registry],
    });
    for (const name of StateName.options) {
      state.set({ bench: live.bench, state: name }, name === snapshot.state ? 1 : 0);
    }
  }
  return registry.metrics();
}

/** `GET /metrics`, for scrapers that send the token of this data folder. */
export function addMetrics(app: FastifyInstance, parts: DeskParts): void {
  app.get("/metrics", async (request, reply) => {
    if (proofOf(request) !== "token") {
      const words =
        "Scrapers send the token of this data folder: Authorization: Bearer …, from its file named token.";
      return reply.code(401).send({ ok: false, reason: "not-signed-in", words });
    }
    return reply
      .header("cache-control", "no-store")
      .type(Registry.OPENMETRICS_CONTENT_TYPE)
      .send(await metricsText(parts));
  });
}
