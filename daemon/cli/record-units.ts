import { convertedUnit } from "../bench-file/channel-kinds.ts";
import { nearest } from "../bench-file/near.ts";
import { parseBench } from "../bench-file/parse.ts";
import type { Conversion } from "../model/conversion.ts";
import { toUnit } from "../physics/convert.ts";
import { RecordProblem } from "../record/problem.ts";
import { openReader, type RecordReader } from "../record/reader.ts";
import { EXIT, Trouble } from "./say.ts";

/** A record, read in units, by the conversions of the bench file that was in use last. */
export interface ReadInUnits {
  readonly reader: RecordReader;
  readonly conversions: Readonly<Record<string, Conversion>>;
}

/** Opens a record for reading. Throws a Trouble where the folder holds none. */
export function openOrSay(folder: string): ReadInUnits {
  try {
    const plain = openReader(folder);
    const parsed = parseBench(plain.lastBenchText() ?? "");
    if (!parsed.ok) return { reader: plain, conversions: {} };
    plain.close();
    const { conversions } = parsed.bench;
    const reader = openReader(folder, (channel, counts) => {
      const conversion = conversions[channel.name];
      return conversion === undefined ? counts * channel.perCount : toUnit(conversion, counts);
    });
    return { reader, conversions };
  } catch (error) {
    if (error instanceof RecordProblem) {
      throw new Trouble(`${error.what} ${error.found}`, error.remedy);
    }
    throw error;
  }
}

/** Unit of a channel as it is exported: converted, or as the board scales it. */
export function unitOf(
  name: string,
  unit: string,
  conversions: ReadInUnits["conversions"],
): string {
  const conversion = conversions[name];
  return conversion === undefined ? unit : (convertedUnit(name, conversion) ?? "");
}

/** Channel names from a list with commas between; one that the record does not have is refused. */
export function namesOf(text: string, reader: RecordReader): string[] {
  const there = reader.channels().map((channel) => channel.name);
  const names = text.split(",").map((name) => name.trim());
  for (const name of names) {
    if (there.includes(name)) continue;
    const near = nearest(name, there);
    throw new Trouble(
      `The record has no channel "${name}"${near === null ? "" : `; did you mean ${near}?`}`,
      `There are ${there.join(", ")}.`,
      EXIT.usage,
    );
  }
  return names;
}
