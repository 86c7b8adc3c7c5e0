import { once } from "node:events";
import { type AddressInfo, createServer, type Server, type Socket } from "node:net";

/** A small instrument: it answers `*IDN?` and one query, a line each, as IEEE 488.2 has it. */
export class ScpiServer {
  /** What the query is answered with; null answers nothing. */
  answer: string | null = "1.83E+00";
  readonly asked: string[] = [];
  readonly #server: Server;
  readonly #sockets = new Set<Socket>();

  private constructor(server: Server) {
    this.#server = server;
    server.on("connection", (socket) => this.#serve(socket));
  }

  static async start(): Promise<ScpiServer> {
    const server = createServer();
    const made = new ScpiServer(server);
    server.listen(0, "127.0.0.1");
    await once(server, "listening");
    return made;
  }

  get port(): number {
    return (this.#server.address() as AddressInfo).port;
  }

  /** Breaks every connection off; new ones are taken. */
  hangUp(): void {
    for (const socket of this.#sockets) socket.destroy();
  }

  async stop(): Promise<void> {
    this.hangUp();
    this.#server.close();
    await once(this.#server, "close");
  }

  #serve(socket: Socket): void {
    this.#sockets.add(socket);
    socket.on("close", () => this.#sockets.delete(socket));
    socket.on("error", () => socket.destroy());
    let rest = "";
    socket.on("data", (bytes) => {
      const lines = `${rest}${bytes.toString("latin1")}`.split("\n");
      rest = lines.pop() ?? "";
      for (const line of lines) {
        this.asked.push(line);
        const answer = line === "*IDN?" ? "Made up,Meter,0,1.0" : this.answer;
        if (answer !== null) socket.write(`${answer}\r\n`);
      }
    });
  }
}
