import { readFileSync } from "node:fs";
import { join } from "node:path";
import { afterAll, beforeAll, describe, expect, test } from "vitest";
import { packageRoot } from "../../daemon/paths.ts";
import { Daemon, Place, runCli } from "./daemon.ts";
import { influxQl, influxServer, makeUser, type RealServer } from "./influx-servers.ts";

const place = new Place();
let server: RealServer;
let file = "";
beforeAll(async () => {
  server = await influxServer(join(place.folder, "influx"));
  await server.start();
  await makeUser(server);
  const north = readFileSync(join(packageRoot, "daemon/bench-file/benches/north.yaml"), "utf8");
  const { url, caFile, credentialsFile } = server.part;
  file = place.file(
    "bench.yaml",
    `${north}\nrecord:\n  influx:\n    url: ${url}\n    database: nights\n    keep: 400 d\n` +
      `    ca-file: ${caFile}\n    credentials-file: ${credentialsFile}\n`,
  );
});
afterAll(async () => {
  await server?.stop();
  place.remove();
});

const count = async (): Promise<number> => {
  const from = '"beamsitter"."beamsitter_samples"';
  try {
    const [row] = await influxQl(server, `SELECT count("host.input") FROM ${from}`);
    return Number(row?.[1] ?? 0);
  } catch {
    // The database, or its policy, is not made yet.
    return 0;
  }
};

/** Asks until it is so; each question waits for the server's answer. */
async function until(fits: () => Promise<boolean>): Promise<void> {
  while (!(await fits())) await new Promise((resolve) => setTimeout(resolve, 100));
}

describe("a daemon whose bench file names a server", () => {
  test("writes there live, says when it cannot, goes on judging, and makes up for it", async () => {
    const daemon = await Daemon.start(place, "north", "--bench", file);
    const told: string[] = [];
    await daemon.client.watch((push) => {
      if (push.push === "event") told.push(push.event.words);
    });
    await until(async () => (await count()) > 20);

    await server.stop();
    await until(async () => told.some((words) => words.includes("does not answer (ECONN")));
    const during = await daemon.snapshot();
    expect(during.age_ms ?? 1e9).toBeLessThan(500);
    expect(during.recorder.words).toBe("");
    await server.start();
    await until(async () => told.includes(`The record reaches ${server.part.url} again.`));
    expect(await daemon.signal("SIGINT")).toBe(0);

    const here = await runCli(place, "export", "-", "--on", "north", "--channels", "current,case");
    expect(here.code).toBe(0);
    const rows = here.stdout.split("\r\n").length - 2;
    expect(await count()).toBe(rows);
    const there = await runCli(
      place,
      ...["export", "-", "--on", "north", "--channels", "current,case", "--from", "influx"],
    );
    expect(there.stderr).toBe("");
    // Elapsed seconds come from microseconds there: the last digit shown may differ by one.
    const plain = (text: string): string => text.replaceAll(/Z,[\d.]+,/g, "Z,");
    expect(plain(there.stdout)).toBe(plain(here.stdout));
  });

  test("a bench file without a server has nothing to export from", async () => {
    const bench = join(packageRoot, "daemon/bench-file/benches/north.yaml");
    const ended = await runCli(place, "export", "-", "--from", "influx", "--bench", bench);
    expect(ended.code).toBe(2);
    expect(ended.stderr).toContain("names no server that keeps the record a second time");
  });
});
