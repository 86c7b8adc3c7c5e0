import { describe, expect, onTestFinished, test } from "vitest";
import { noteSent } from "../../../daemon/record/influx-exported.ts";
import { newPlace, PlaceFile, placeFile } from "../../../daemon/record/influx-place.ts";
import { NO_STAMP } from "../../../daemon/record/influx-stamps.ts";
import { Store } from "../../../daemon/record/store.ts";
import { rowMaker } from "./row-maker.ts";
import { recordRows, scratchFolder } from "./synthetic.ts";

const COUNT = 4000;

describe("what retention may take of a record with a second home", () => {
  test("is what was confirmed there, whole blocks only", () => {
    const { folder, remove } = scratchFolder();
    onTestFinished(remove);
    recordRows(
      folder,
      rowMaker(1, (i) => i * 50),
      COUNT,
    );
    const store = Store.open(folder);
    onTestFinished(() => store.close());
    const place = newPlace("fake");
    const blocks = store.within(
      (db) => db.prepare("SELECT t0, t1, input1 FROM blocks ORDER BY id").all() as Block[],
    );
    const sentAfter = (input: number): unknown[] => {
      const runs = { 1: { input, stamps: NO_STAMP } };
      new PlaceFile(placeFile(folder)).save({ ...place, runs });
      noteSent(store, 5);
      return store.within((db) => db.prepare("SELECT * FROM exported").all());
    };
    const [first, second, third] = blocks;
    expect(blocks.length).toBeGreaterThan(2);
    expect(sentAfter((first?.input1 ?? 0) - 1)).toEqual([]);
    const row = { bench: "north", target: "influx", from_wall_ms: first?.t0, at_wall_ms: 5 };
    expect(sentAfter((third?.input1 ?? 0) - 1)).toEqual([{ ...row, to_wall_ms: second?.t1 }]);
    expect(sentAfter(COUNT)).toEqual([{ ...row, to_wall_ms: blocks.at(-1)?.t1 }]);
  });
});

interface Block {
  readonly t0: number;
  readonly t1: number;
  readonly input1: number;
}
