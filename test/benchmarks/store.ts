import { spawn } from "node:child_process";
import { setPriority } from "node:os";
import { dirname } from "node:path";
import { fileURLToPath } from "node:url";
import { builtFile } from "../../daemon/paths.ts";
import type { Figure } from "./figure.ts";
import { reactionBeside } from "./reaction.ts";
import { BEGIN_ms, entropyFloor, type RowShape } from "./store/noise.ts";
import { ask, codecSpeed, scratch, sizes, write } from "./store/own.ts";
import { influx, type Peer, victoria } from "./store/peers.ts";
import { year } from "./store/year.ts";

const DAY: RowShape = { channels: 7, rate_perS: 100, sigma: 2 };
/** Hours of the day that is given to every store; fewer for a quick look. */
const HOURS = Number(process.env.BENCH_STORE_HOURS ?? 24);
/** Other noises, of an hour each. */
const SIGMAS = [0.5, 8];
/** Sustained writing: this many channels at this rate, for so many simulated minutes. */
const STEADY: RowShape = { channels: 16, rate_perS: 1000, sigma: 2 };
const STEADY_MINUTES = 10;
/** As the daemon's own desk, which is who asks. */
const DESK_NICENESS = 10;
/** Rows that wait in memory when a stall ends: whole blocks. */
const STALLED_ROWS = 48_000;

/** The record beside other stores, all with the same samples in the same run. */
export async function store(): Promise<Figure[]> {
  const figures: Figure[] = [];
  const { folder, remove } = scratch();
  try {
    const rows = HOURS * 3600 * DAY.rate_perS;
    const { values_perS } = write(folder, DAY, rows, STALLED_ROWS);
    const peers = {
      influx: await influx(dirname(folder), DAY, rows),
      victoria: await victoria(dirname(folder), DAY, rows),
    };
    figures.push(figure("catchUpMvalues", values_perS / 1e6, "M/s"));
    figures.push(...sizeFigures(folder, rows, peers), ...(await timeFigures(folder, peers)));
  } finally {
    remove();
  }
  figures.push(...codecFigures(), ...SIGMAS.flatMap(noiseFigures), steadyFigure());
  figures.push(await loopFigure());
  const { bytes, open_ms, picture_ms } = await year();
  figures.push(figure("year.GB", bytes / 1e9, "GB"), figure("year.openMs", open_ms, "ms"));
  figures.push(figure("year.picture.ms", picture_ms, "ms"));
  return figures;
}

interface Peers {
  readonly influx: Peer | null;
  readonly victoria: Peer | null;
}

const figure = (name: string, value: number, unit: string): Figure => ({
  name: `store.${name}`,
  value,
  unit,
});

/** A figure with how many times less than a peer's it is; the peer is named also where it is missing. */
function against(made: Figure, name: string, peer: number | undefined): Figure {
  if (peer === undefined) return { ...made, peer: `${name}, which is not installed here` };
  return { ...made, peer: name, ratio: peer / made.value };
}

function sizeFigures(folder: string, rows: number, peers: Peers): Figure[] {
  const size = sizes(folder, rows * DAY.channels);
  const file = figure("bytesPerValue", size.file, "B");
  const found = [
    figure("entropyFloorBytes", entropyFloor(DAY, rows), "B"),
    figure("blockBytesPerValue", size.blocks, "B"),
    figure("rollupBytesPerValue", size.rollups, "B"),
    against(file, "influx", peers.influx?.bytesPerValue),
  ];
  const { victoria: vm } = peers;
  if (vm !== null) found.push(figure("victoriaBytesPerValue", vm.bytesPerValue, "B"));
  return found;
}

async function timeFigures(folder: string, peers: Peers): Promise<Figure[]> {
  const end_ms = BEGIN_ms + HOURS * 3_600_000;
  const day = await ask(folder, HOURS, end_ms);
  const hour = await ask(folder, 1, end_ms);
  const minute = await ask(folder, 1 / 60, end_ms);
  const cold = figure("day2000px.ms", day.cold_ms, "ms");
  const warm = figure("day2000px.warm.ms", day.warm_ms, "ms");
  return [
    against(cold, "influx", peers.influx?.day_ms),
    against(warm, "victoria-metrics", peers.victoria?.day_ms),
    figure("hour2000px.ms", hour.cold_ms, "ms"),
    figure("minute2000px.ms", minute.cold_ms, "ms"),
  ];
}

function codecFigures(): Figure[] {
  const { encode_perS, decode_perS } = codecSpeed(DAY);
  return [
    figure("encodeMvalues", encode_perS / 1e6, "M/s"),
    figure("decodeMvalues", decode_perS / 1e6, "M/s"),
  ];
}

function noiseFigures(sigma: number): Figure[] {
  const { folder, remove } = scratch();
  try {
    const shape = { ...DAY, sigma };
    const rows = 3600 * shape.rate_perS;
    write(folder, shape, rows, STALLED_ROWS);
    const size = sizes(folder, rows * shape.channels);
    return [
      figure(`sigma${sigma}.entropyFloorBytes`, entropyFloor(shape, rows), "B"),
      figure(`sigma${sigma}.blockBytesPerValue`, size.blocks, "B"),
    ];
  } finally {
    remove();
  }
}

/** The judging thread's reaction while its record, two hours long already, is asked without a pause. */
async function loopFigure(): Promise<Figure> {
  const { ours_ms, echo_ms } = await reactionBeside((record) => {
    write(record, DAY, 2 * 3600 * DAY.rate_perS, STALLED_ROWS);
    const heavy = spawn(
      process.execPath,
      [fileURLToPath(builtFile("test/benchmarks/heavy-reader.js")), record],
      { stdio: "ignore" },
    );
    setPriority(heavy.pid ?? 0, DESK_NICENESS);
    return () => heavy.kill("SIGKILL");
  });
  return against(figure("loop.p999", ours_ms, "ms"), "c-echo", echo_ms);
}

function steadyFigure(): Figure {
  const { folder, remove } = scratch();
  try {
    // A commit each half second, as a daemon does.
    const rows = STEADY_MINUTES * 60 * STEADY.rate_perS;
    return figure("writeCpuPercent", write(folder, STEADY, rows, 500).cpu_percent, "%");
  } finally {
    remove();
  }
}
