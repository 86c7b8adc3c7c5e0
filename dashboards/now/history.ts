import type { EventLine, SeriesJson } from "../../daemon/desk/api.ts";
import { addEvents, track } from "./state.ts";
import { RECORDED, TRACK_ms } from "./track.ts";

/** Entries asked for: about one in two seconds, finer than any screen's pixel of 40 minutes. */
const PIXELS = 1400;
const LOAD_ms_MAX = 15_000;

async function get<T>(address: string): Promise<T | undefined> {
  const response = await fetch(address, { signal: AbortSignal.timeout(LOAD_ms_MAX) });
  return response.ok ? ((await response.json()) as T) : undefined;
}

/**
 * Fetches the past that the picture shows, up to `now` (ms since 1970). Without it the picture
 * begins at now: that the record does not answer is no reason to show nothing.
 */
export async function loadHistory(now: number): Promise<void> {
  const window = `from=${Math.round(now - TRACK_ms)}&to=${Math.round(now)}`;
  const channels = Object.values(RECORDED).join(",");
  const [series, past] = await Promise.allSettled([
    get<SeriesJson>(`/api/series?channels=${channels}&${window}&pixels=${PIXELS}`),
    get<EventLine[]>(`/api/events?${window}`),
  ]);
  if (series.status === "fulfilled" && series.value !== undefined) track.remember(series.value);
  if (past.status === "fulfilled" && past.value !== undefined) addEvents(past.value);
}
