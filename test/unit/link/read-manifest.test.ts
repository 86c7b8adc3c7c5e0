import { once } from "node:events";
import { type AddressInfo, createServer, type Server } from "node:net";
import { afterEach, beforeEach, expect, test } from "vitest";
import { readManifest, toldBy } from "../../../daemon/cli/read-manifest.ts";
import { FakeBoard } from "./fake-board.ts";

let server: Server;
let board: FakeBoard;

/** The fake board behind a TCP port. */
beforeEach(async () => {
  board = new FakeBoard();
  server = createServer((socket) => {
    let rest = "";
    socket.on("error", () => socket.destroy());
    socket.on("data", (bytes) => {
      const lines = `${rest}${bytes.toString("latin1")}`.split("\n");
      rest = lines.pop() ?? "";
      for (const line of lines) board.receive(line.trim());
      for (const line of board.take()) socket.write(`${line}\n`);
    });
  });
  server.listen(0, "127.0.0.1");
  await once(server, "listening");
});
afterEach(() => void server.close());

const address = (): string => `127.0.0.1:${(server.address() as AddressInfo).port}`;

test("a connected board is asked who it is, and nothing that could change it", async () => {
  const manifest = await readManifest(address(), 115_200);
  expect(manifest.serial).toBe("BS-0001");
  expect(board.heard.every((body) => body.startsWith("who "))).toBe(true);
  expect(toldBy(manifest)).toEqual({ board: "BS-0001", rate: "50 /s", full: "1024 counts" });
});

test("a port where nobody listens is told in words", async () => {
  const gone = address();
  server.close();
  await once(server, "close");
  await expect(readManifest(gone, 115_200)).rejects.toThrow("refuses");
});

test("a board without a case channel is refused before anything is written", async () => {
  const manifest = await readManifest(address(), 115_200);
  const channels = manifest.channels.filter(({ name }) => name !== "case");
  expect(() => toldBy({ ...manifest, channels })).toThrow("no channel named case");
});
