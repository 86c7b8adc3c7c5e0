import { mkdtempSync, rmSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { afterAll, beforeAll, describe, expect, test } from "vitest";
import { ROW } from "../../daemon/model/ring.ts";
import { openForReading } from "../../daemon/record/folder.ts";
import { PlaceFile, placeFile } from "../../daemon/record/influx-place.ts";
import { InfluxServer } from "../../daemon/record/influx-server.ts";
import { SecondHome } from "../../daemon/record/second-home.ts";
import { rowMaker } from "../unit/record/row-maker.ts";
import { recordRows } from "../unit/record/synthetic.ts";
import { fetchText, type RealServer, victoriaServer } from "./influx-servers.ts";

const COUNT = 6000;

let root = "";
let server: RealServer;
beforeAll(async () => {
  root = mkdtempSync(join(tmpdir(), "beamsitter-victoria-"));
  server = await victoriaServer(join(root, "victoria"));
  await server.start();
});
afterAll(async () => {
  await server?.stop();
  rmSync(root, { recursive: true, force: true });
});

function homeOf(folder: string): SecondHome {
  const look = <T>(work: (db: ReturnType<typeof openForReading>) => T): T => {
    const db = openForReading(folder);
    try {
      return work(db);
    } finally {
      db.close();
    }
  };
  const there = new InfluxServer(server.part, "unused");
  return new SecondHome(look, there, new PlaceFile(placeFile(folder)), server.part.url);
}

interface Exported {
  readonly metric: Readonly<Record<string, string>>;
  readonly values: number[];
  readonly timestamps: number[];
}

/** Every sample the server has of one metric, past the code under test. */
async function exported(metric: string): Promise<Exported[]> {
  await fetchText("GET", `${server.part.url}/internal/force_flush`, null);
  const match = encodeURIComponent(`{__name__="${metric}"}`);
  const text = await fetchText("GET", `${server.part.url}/api/v1/export?match[]=${match}`, null);
  return text
    .split("\n")
    .filter((line) => line !== "")
    .map((line) => JSON.parse(line) as Exported);
}

describe("a VictoriaMetrics node", () => {
  test("takes the same writes: every sample once, also when all are sent again", async () => {
    const folder = join(root, "data");
    // Four samples share each civil time, as after a stall: each gets a millisecond of its own.
    const rows = recordRows(
      folder,
      rowMaker(4, (i) => Math.floor(i / 4) * 200),
      COUNT,
    );
    for (let time = 0; time < 2; time++) {
      rmSync(placeFile(folder), { force: true });
      const home = homeOf(folder);
      while (await home.step());
      expect(home.words).toBe("");
      expect(home.waiting).toBe(0);
    }
    const [found, ...others] = await exported("beamsitter_samples_current");
    expect(others).toEqual([]);
    expect(found?.metric).toMatchObject({ bench: "north", session: "1", manifest: "0badcafe" });
    expect(found?.values).toEqual(rows.map((row) => row[ROW.values + 1]));
    expect(found?.timestamps).toEqual(rows.map((row, i) => (row[ROW.wall_ms] as number) + (i % 4)));
    const slow = (await exported("beamsitter_samples_sink"))[0];
    expect(slow?.values).toEqual(
      rows.filter((_, i) => i % 2 === 0).map((row) => row[ROW.values + 4]),
    );
    const scale = (await exported("beamsitter_channels_per_count")).find(
      (series) => series.metric.channel === "case",
    );
    expect(scale?.values).toEqual([0.01]);
  });
});
