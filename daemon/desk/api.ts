/** The types that pages share with the desk; types only, so that no page carries daemon code. */
export type { EventLine, Snapshot, SwitchAnswer } from "../control/api.ts";
export type { LivePush } from "./live.ts";
export type { SeriesJson, TraceJson } from "./series.ts";
