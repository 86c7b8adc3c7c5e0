import { once } from "node:events";
import { type AddressInfo, createServer, type Server, type Socket } from "node:net";
import { afterEach, describe, expect, test, vi } from "vitest";
import { TcpTransport } from "../../../daemon/link/transports/tcp.ts";

const WAIT = { timeout: 5000, interval: 5 };
const ends: { close(): void }[] = [];

const serve = async (met: (socket: Socket) => void): Promise<{ server: Server; port: number }> => {
  const server = createServer((socket) => {
    ends.push({ close: () => socket.destroy() });
    met(socket);
  });
  server.listen(0, "127.0.0.1");
  await once(server, "listening");
  ends.push(server);
  return { server, port: (server.address() as AddressInfo).port };
};

const open = (port: number, silence_ms = 4000) => {
  const told = { opened: 0, lines: [] as string[], closed: [] as string[] };
  const transport = new TcpTransport({ host: "127.0.0.1", port, silence_ms });
  ends.push(transport);
  transport.open({
    opened: () => {
      told.opened += 1;
    },
    line: (line) => told.lines.push(line),
    closed: (why) => told.closed.push(why),
  });
  return { transport, told };
};

afterEach(() => {
  for (const end of ends.splice(0)) end.close();
});

describe("TCP", () => {
  test("lines both ways; drained once they have left", async () => {
    let heard = "";
    const { port } = await serve((socket) => {
      socket.on("data", (chunk) => {
        heard += chunk.toString("latin1");
        socket.write("<say heard\r\n");
      });
    });
    const { transport, told } = open(port);
    expect(transport.write("too early\n")).toBe(false);
    await vi.waitFor(() => expect(told.opened).toBe(1), WAIT);
    expect(transport.write(">who 1 90B2\n")).toBe(true);
    await vi.waitFor(() => expect(told.lines).toEqual(["<say heard"]), WAIT);
    expect(heard).toBe(">who 1 90B2\n");
    expect(transport.drained).toBe(true);
    transport.close();
    expect(transport.write("late\n")).toBe(false);
    expect(transport.drained).toBe(false);
    expect(told.closed).toEqual([]);
  });

  test("nothing listens there: says so and what to check", async () => {
    const { server, port } = await serve(() => {});
    server.close();
    await once(server, "close");
    const { told } = open(port);
    await vi.waitFor(() => expect(told.closed).toHaveLength(1), WAIT);
    expect(told.closed[0]).toMatch(/nothing listens there\. Check the board's address, port and/);
    expect(told.opened).toBe(0);
  });

  test("the far end hangs up: closed once", async () => {
    const { port } = await serve((socket) => socket.end("<say goodbye\n"));
    const { told } = open(port);
    await vi.waitFor(() => expect(told.closed).toHaveLength(1), WAIT);
    expect(told.lines).toEqual(["<say goodbye"]);
    expect(told.closed[0]).toMatch(/hung up/);
  });

  test("a silent far end is given up", async () => {
    const { port } = await serve(() => {});
    const { told } = open(port, 100);
    await vi.waitFor(() => expect(told.closed).toHaveLength(1), WAIT);
    expect(told.closed[0]).toMatch(/sent nothing for 0\.\d s/);
  });

  test("a far end that reads nothing does not make us collect orders", async () => {
    const { port } = await serve((socket) => socket.pause());
    const { transport, told } = open(port);
    await vi.waitFor(() => expect(told.opened).toBe(1), WAIT);
    const line = `${"p".repeat(99)}\n`;
    let dropped = false;
    // What the two kernels hold between them is theirs; ours is bounded.
    for (let i = 0; i < 1_000_000 && !dropped; i += 1) dropped = !transport.write(line);
    expect(dropped).toBe(true);
    expect(transport.drained).toBe(false);
  });
});
