import { batch } from "@preact/signals";
import type { LivePush, Snapshot } from "../../daemon/desk/api.ts";
import { loadHistory } from "./history.ts";
import { addEvents, clock_ms, heard_ms, lineUp, signedOut, snapshot, track } from "./state.ts";

/** Shortest time between two drawings, ms: digits that change faster cannot be read. */
const DRAW_ms = 250;
/** Pause before the page asks again after it lost the stream, ms. */
const AGAIN_ms = 2000;
/** No message at all for this long: the connection is given up and made anew, ms. */
const SILENT_ms = 6000;

let newest: Snapshot | undefined;
let drawn_ms = Number.NEGATIVE_INFINITY;
/** When the last snapshot came, and when the connection last showed life. */
let snapshot_ms = performance.now();
let life_ms = performance.now();
let socket: WebSocket | undefined;

function take(s: Snapshot): void {
  track.append(s);
  newest = s;
  snapshot_ms = performance.now();
  if (s.state !== snapshot.value?.state || snapshot_ms - drawn_ms >= DRAW_ms) draw();
}

function draw(): void {
  drawn_ms = performance.now();
  batch(() => {
    heard_ms.value = snapshot_ms;
    clock_ms.value = drawn_ms;
    snapshot.value = newest;
  });
}

function onMessage(text: string): void {
  life_ms = performance.now();
  const push = JSON.parse(text) as LivePush;
  if (push.push === "snapshot") take(push.snapshot);
  else if (push.push === "event") addEvents([push.event]);
  else lineUp.value = push.connected;
}

/** Whether the desk still knows this browser; it may have got a new token meanwhile. */
async function checkSignedIn(): Promise<void> {
  try {
    const response = await fetch("/api/snapshot", { signal: AbortSignal.timeout(AGAIN_ms) });
    signedOut.value = response.status === 401;
  } catch {
    // No answer at all: the silence itself is shown by its age.
    signedOut.value = false;
  }
}

function connect(): void {
  life_ms = performance.now();
  const mine = new WebSocket(`ws://${location.host}/api/live`);
  socket = mine;
  mine.onopen = () => {
    signedOut.value = false;
    void loadHistory(Date.now());
  };
  mine.onmessage = ({ data }) => onMessage(`${data}`);
  mine.onclose = () => {
    if (socket !== mine) return;
    socket = undefined;
    void checkSignedIn();
    setTimeout(connect, AGAIN_ms);
  };
}

/** Opens the stream and keeps it: asks again every 2 s for as long as the page is open. */
export function startLive(): void {
  connect();
  setInterval(() => {
    clock_ms.value = performance.now();
    if (newest !== undefined && newest !== snapshot.value) draw();
    if (socket !== undefined && performance.now() - life_ms > SILENT_ms) {
      // A stopped desk closes nothing; a new connection finds the next one.
      const old = socket;
      socket = undefined;
      old.close();
      connect();
    }
  }, 500);
}
