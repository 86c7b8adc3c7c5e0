import { stat } from "node:fs/promises";
import { groupName, listPorts, ownerWords } from "./ports.ts";

const permissionWords = async (path: string): Promise<string> => {
  const group = await groupName(path);
  return (
    `${path} may not be opened by this user; it belongs to group ${group}. ` +
    `Run: sudo usermod -aG ${group} "$USER", then sign out and in again.`
  );
};

const missingWords = async (path: string): Promise<string> => {
  const ports = await listPorts();
  const there =
    ports.length === 0
      ? "No serial port is there: check cable, power and driver."
      : `There is: ${ports.map((p) => (p.problem === "" ? p.path : `${p.path} (${p.problem})`)).join(", ")}.`;
  return `${path} does not exist. ${there} Put the right one into the bench file, under controller.`;
};

/**
 * Why a port could not be opened, and what to do about it.
 *
 * @param path device file as it was asked for
 * @param message what the driver's library said
 */
export const openFailureWords = async (path: string, message: string): Promise<string> => {
  if (/cannot lock|resource temporarily unavailable|busy/i.test(message)) {
    const owner = await ownerWords(path);
    const by = owner === "" ? "another program" : `another program (${owner})`;
    return `${path} is in use by ${by}. One host speaks to a board: end that program first.`;
  }
  if (/permission denied|EACCES|access denied/i.test(message)) return permissionWords(path);
  if (/no such file|ENOENT|cannot find/i.test(message)) return missingWords(path);
  const kind = await stat(path).catch(() => null);
  if (kind !== null && !kind.isCharacterDevice()) {
    return `${path} is no serial port but a ${kind.isDirectory() ? "folder" : "file"}. \`beamsitter ports\` lists the ports.`;
  }
  if (/inappropriate ioctl|not a typewriter/i.test(message)) {
    return `${path} is a device, but no serial port. \`beamsitter ports\` lists the ports.`;
  }
  if (/baud/i.test(message)) {
    return `${path} does not take this baud rate (${message}). The board's page names its rate.`;
  }
  return `${path} could not be opened: ${message}. \`beamsitter ports\` lists the ports.`;
};
