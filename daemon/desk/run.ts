import type { AddressInfo } from "node:net";
import { setPriority } from "node:os";
import { join } from "node:path";
import { SwitchClient } from "../control/client.ts";
import type { InfluxPart } from "../model/bench.ts";
import { pagesRoot } from "../paths.ts";
import { toUnit } from "../physics/convert.ts";
import { CREDENTIALS_FILE } from "../record/influx-credentials.ts";
import { PlaceFile, placeFile } from "../record/influx-place.ts";
import { InfluxReader } from "../record/influx-reader.ts";
import { InfluxServer } from "../record/influx-server.ts";
import { type Converter, openReader } from "../record/reader.ts";
import { BEAT_ms, DeskConfig, type FromDesk, ToDesk } from "./config.ts";
import { Live } from "./live.ts";
import { buildServer } from "./server.ts";
import { readToken, SignIn } from "./sign-in.ts";
import { SwitchLine } from "./switch-line.ts";

/** Below the judging thread, so that a busy page never delays a permit. */
const NICE = 10;

const toParent = (message: FromDesk): void => {
  // A daemon that is just being killed cannot be told anything: "disconnect" follows and ends us.
  if (process.connected) process.send?.(message, () => {});
};

/** Wires and starts the desk of one data folder; resolves when it listens, rejects in words. */
export async function runDesk(configText: string): Promise<void> {
  const config = DeskConfig.parse(JSON.parse(configText));
  setPriority(NICE);
  const sign = new SignIn(readToken(config.tokenFile));
  let conversions = config.conversions ?? {};
  process.on("message", (message) => {
    const order = ToDesk.safeParse(message);
    if (!order.success) return;
    if (order.data.kind === "code") sign.offer(order.data.code);
    else conversions = order.data.conversions;
  });
  // Without its daemon a desk shows nothing and could do nothing; the next one starts afresh.
  process.on("disconnect", () => process.exit(0));
  // It may have been killed while this process was still loading: that event is over by now.
  if (process.connected === false) process.exit(0);

  const live = new Live();
  const line = new SwitchLine(() => SwitchClient.connect(config.switchPath), {
    push: (push) => live.take(push),
    line: (connected) => live.line(connected),
  });
  const convert: Converter = (channel, counts) => {
    const conversion = conversions[channel.name];
    return conversion === undefined ? counts * channel.perCount : toUnit(conversion, counts);
  };
  const folder = openReader(config.folder, convert);
  const record = config.influx === undefined ? folder : homeRecord(config, config.influx, convert);
  const place = new PlaceFile(placeFile(config.folder));
  const waiting = (): number | null => {
    const sent = place.load()?.samples;
    const kept = folder.sessions().reduce((sum, session) => sum + session.samples, 0);
    return sent === undefined ? null : Math.max(0, kept - sent);
  };
  const pages = config.pages ?? pagesRoot;
  const app = await buildServer({ config, pages, sign, line, live, record, waiting });
  await line.open();
  await app.listen({ host: config.host, port: config.port });
  const { port } = app.server.address() as AddressInfo;
  sign.nameCookieFor(port);
  toParent({ kind: "listening", host: config.host, port });
  setInterval(() => toParent({ kind: "beat", clients: live.pages }), BEAT_ms);
}

/** The second home, read in place of the folder. */
function homeRecord({ folder }: DeskConfig, influx: InfluxPart, convert: Converter): InfluxReader {
  return new InfluxReader(new InfluxServer(influx, join(folder, CREDENTIALS_FILE)), convert);
}

/** The words of a failed start, for the daemon to print. */
export function tellFailure(error: unknown): void {
  const words = error instanceof Error ? error.message : `${error}`;
  toParent({ kind: "failed", words });
  process.stderr.write(`The desk did not start: ${words}\n`);
  process.exitCode = 1;
  process.disconnect?.();
}
