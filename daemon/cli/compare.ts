import { formatQuantity } from "../model/quantities.ts";
import { wall } from "../model/times.ts";
import { openOrSay } from "./record-units.ts";

/** The photodiode's samples on both sides of a reading that are taken for its comparison. */
const AROUND_ms = 5000;

/** What the photodiode read about then, beside a power in mW, in words; empty where it is not known. */
export async function comparison(
  folder: string,
  bench: string,
  at: number,
  value_mW: number,
): Promise<string> {
  const { reader } = openOrSay(folder);
  try {
    const window = { from: wall(at - AROUND_ms), to: wall(at + AROUND_ms) };
    const channels = ["photodiode"];
    const answer = await reader.series({ bench, channels, window, pixels: 1 });
    const trace = answer.channels.photodiode;
    const read_mW = meanOf(trace?.mean ?? [], trace?.n ?? []);
    if (!(read_mW > 0) || !(value_mW > 0)) return "";
    const share = formatQuantity("ratio", Math.abs(read_mW / value_mW - 1), 0.001);
    const side = read_mW >= value_mW ? "more" : "less";
    return `The photodiode read ${formatQuantity("power", read_mW)} then, ${share} ${side}.`;
  } finally {
    reader.close();
  }
}

function meanOf(means: ArrayLike<number>, counts: ArrayLike<number>): number {
  let sum = 0;
  let n = 0;
  for (let i = 0; i < means.length; i++) {
    sum += (means[i] ?? 0) * (counts[i] ?? 0);
    n += counts[i] ?? 0;
  }
  return sum / n;
}
