import { describe, expect, test } from "vitest";
import { ANSWER, ORDER } from "../../../daemon/judge/records.ts";
import { Rig } from "./rig.ts";

describe("first-out", () => {
  test("the first row of a sample on which several trip", () => {
    const rig = new Rig().light(1500);
    rig.key = false;
    rig.loop = false;
    rig.curve = false;
    rig.sample(5);
    expect(rig.trips()).toEqual([74]);
    expect(rig.out.view.cause).toBe(74);
  });

  test("a second trip keeps it, and orders dark again", () => {
    const rig = new Rig().light(1500);
    rig.board.obeys = false;
    rig.key = false;
    rig.sample();
    rig.fact("port-closed");
    rig.fact("introduced");
    rig.fact("board-changed");
    expect(rig.trips()).toEqual([74]);
    expect(rig.out.dark).toBe(82);
    expect(rig.out.view.cause).toBe(74);
  });

  test("the board's cause, where the host had ordered none", () => {
    const rig = new Rig().light(1500);
    rig.board = { ...rig.board, armed: false, tripped: true, cause: 16 };
    rig.key = false;
    rig.sample();
    expect(rig.trips()).toEqual([16]);
    expect(rig.out.dark).toBe(16);
  });

  test("the host's cause, where the board latches another while the order is on its way", () => {
    const rig = new Rig().light(1500);
    rig.key = false;
    rig.sample();
    rig.board = { ...rig.board, armed: false, tripped: true, cause: 16 };
    rig.sample(5);
    expect(rig.trips()).toEqual([74]);
    expect(rig.out.view.cause).toBe(74);
  });

  test("a latch without a cause reads unknown", () => {
    const rig = new Rig().connect();
    rig.board = { ...rig.board, tripped: true, cause: 0 };
    rig.sample();
    expect(rig.trips()).toEqual([255]);
  });
});

describe("reset", () => {
  const tripped = (): Rig => {
    const rig = new Rig().light(1500);
    rig.key = false;
    rig.sample(2);
    rig.key = true;
    rig.sample(1);
    return rig;
  };

  test("names the cause, clears the board first and the host when a sample shows it", () => {
    const rig = tripped();
    expect(rig.stateName).toBe("tripped");
    expect(rig.request("reset", 74)).toBe("none");
    expect([rig.out.order, rig.out.orderValue, rig.out.answer]).toEqual([
      ORDER.reset,
      74,
      ANSWER.begun,
    ]);
    expect(rig.stateName).toBe("tripped");
    rig.sample();
    expect(rig.stateName).toBe("standby");
    expect(rig.answers.at(-1)?.answer).toBe(ANSWER.done);
    expect(rig.events("reset").map((e) => e.hazard)).toEqual([74]);
    rig.sample(200);
    expect(rig.permits.filter((p) => p.at_ms > rig.now_ms - 4000)).toEqual([]);
  });

  test("gives the board its own cause where that differs", () => {
    const rig = new Rig().light(1500);
    rig.loop = false;
    rig.sample();
    rig.board = { ...rig.board, armed: false, tripped: true, cause: 17 };
    rig.loop = true;
    rig.sample();
    expect(rig.request("reset", 75)).toBe("none");
    expect(rig.out.orderValue).toBe(17);
    rig.sample();
    expect(rig.stateName).toBe("standby");
  });

  test("is refused while not tripped, with another cause, or with key or loop open", () => {
    expect(new Rig().connect().request("reset", 74)).toBe("not-tripped");
    const rig = tripped();
    expect(rig.request("reset", 75)).toBe("wrong-cause");
    expect(rig.out.answerValue).toBe(74);
    rig.key = false;
    rig.sample();
    expect(rig.request("reset", 74)).toBe("key-off");
    rig.key = true;
    rig.loop = false;
    rig.sample();
    expect(rig.request("reset", 74)).toBe("loop-open");
  });

  test("is refused while the board still has light", () => {
    const rig = new Rig().light(1500);
    rig.board.obeys = false;
    rig.curve = false;
    rig.sample();
    rig.curve = true;
    rig.sample();
    expect(rig.request("reset", 80)).toBe("busy");
  });

  test("refused by the board, or not answered, keeps the bench tripped", () => {
    const refused = tripped();
    refused.board.obeys = false;
    refused.request("reset", 74);
    refused.fact("reset-refused", 3);
    expect(refused.answers.at(-1)?.refusal).toBe("board");
    expect(refused.stateName).toBe("tripped");
    refused.request("reset", 74);
    refused.sample(151);
    expect(refused.answers.at(-1)?.refusal).toBe("no-answer");
    expect(refused.stateName).toBe("tripped");
  });

  test("a dark asked for while tripped stays tripped", () => {
    const rig = tripped();
    expect(rig.request("dark")).toBe("none");
    rig.sample(10);
    expect([rig.stateName, rig.out.view.cause]).toEqual(["tripped", 74]);
  });
});

describe("reconnecting", () => {
  test("only a bench that was dark and not latched comes back to standby", () => {
    const rig = new Rig().connect();
    rig.fact("port-closed");
    expect(rig.stateName).toBe("offline");
    rig.fact("introduced");
    rig.sample(5);
    expect(rig.stateName).toBe("standby");
    expect(rig.told.map((e) => e.kind)).toEqual(["connected", "disconnected", "connected"]);
  });

  test("a bench that was lit comes back tripped, and stays so until reset and armed", () => {
    const rig = new Rig().light(1500);
    rig.fact("port-closed");
    expect([rig.stateName, rig.out.view.flags & 64]).toEqual(["tripped", 64]);
    rig.board = { ...rig.board, armed: false, tripped: true, cause: 2 };
    rig.fact("introduced");
    rig.sample(50);
    expect([rig.stateName, rig.out.view.cause, rig.out.view.flags & 64]).toEqual([
      "tripped",
      83,
      0,
    ]);
    expect(rig.arm(1000)).toBe("tripped");
    rig.request("reset", 83);
    expect(rig.out.orderValue).toBe(2);
    rig.sample();
    expect(rig.stateName).toBe("standby");
    const before = rig.permits.length;
    rig.sample(100);
    expect(rig.permits.length).toBe(before);
    expect(rig.arm(1000)).toBe("none");
    rig.sample(300);
    expect(rig.stateName).toBe("emitting");
  });

  test("a board found tripped trips the host", () => {
    const rig = new Rig();
    rig.board = { ...rig.board, tripped: true, cause: 6 };
    rig.connect();
    expect([rig.stateName, rig.out.view.cause]).toEqual(["tripped", 6]);
  });

  test("another board starts tripped", () => {
    const rig = new Rig();
    rig.fact("board-changed");
    rig.fact("introduced");
    rig.sample(5);
    expect([rig.stateName, rig.out.view.cause]).toEqual(["tripped", 82]);
    expect(rig.request("reset", 82)).toBe("none");
    expect(rig.stateName).toBe("standby");
  });

  test("numbers that begin anew with the board are taken up", () => {
    const rig = new Rig().connect();
    rig.fact("board-reset", 1);
    expect(rig.stateName).toBe("offline");
    rig.fact("introduced");
    rig.input.sample.seq = 0;
    rig.input.sample.tick = 0;
    rig.sample(10);
    expect(rig.stateName).toBe("standby");
    expect(rig.arm(1000)).toBe("none");
    rig.sample(300);
    expect(rig.stateName).toBe("emitting");
  });
});
