import type { SwitchAnswer } from "../../daemon/desk/api.ts";

/** A little more than the switch itself takes before it gives up, ms. */
const ANSWER_ms_MAX = 7000;

/** Posts one request to the desk. A silence comes back as a refusal in words. */
export async function ask(address: string, body: unknown): Promise<SwitchAnswer> {
  try {
    const response = await fetch(address, {
      method: "POST",
      headers: { "content-type": "application/json" },
      body: JSON.stringify(body),
      signal: AbortSignal.timeout(ANSWER_ms_MAX),
    });
    return (await response.json()) as SwitchAnswer;
  } catch {
    const words = "No answer came from the desk, so it is not known whether this was carried out.";
    return { id: 0, ok: false, reason: "no-answer", words };
  }
}
