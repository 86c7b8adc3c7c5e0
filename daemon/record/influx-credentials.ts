import { readFileSync, statSync } from "node:fs";
import { HomeTrouble } from "./influx-trouble.ts";
import { errorCode } from "./problem.ts";

/** Who asks the server. */
export interface Credentials {
  readonly user: string;
  readonly password: string;
}

export const USER_VARIABLE = "BEAMSITTER_INFLUX_USER";
export const PASSWORD_VARIABLE = "BEAMSITTER_INFLUX_PASSWORD";
/** Name of the credentials file in a data folder, where the bench file names no other. */
export const CREDENTIALS_FILE = "influx-credentials";

/**
 * User and password: from the environment, else from a file whose first line is the user and whose
 * second is the password. Null where there is neither: the server may ask for none. Throws a
 * HomeTrouble for a file that others can read or that holds something else.
 */
export function readCredentials(
  file: string,
  environment: NodeJS.ProcessEnv = process.env,
): Credentials | null {
  const user = environment[USER_VARIABLE];
  const password = environment[PASSWORD_VARIABLE];
  if (user !== undefined && user !== "") return { user, password: password ?? "" };
  try {
    const mode = statSync(file).mode & 0o777;
    if ((mode & 0o077) !== 0) {
      throw new HomeTrouble(
        "later",
        `${file} has mode ${mode.toString(8)}, so others can read the password; wanted 600. Run: chmod 600 ${file}.`,
      );
    }
    const [name = "", secret = ""] = readFileSync(file, "utf8").split(/\r?\n/);
    if (name !== "" && secret !== "") return { user: name, password: secret };
    throw new HomeTrouble(
      "later",
      `${file} does not hold a user on its first line and a password on its second. Write them so.`,
    );
  } catch (error) {
    if (errorCode(error) === "ENOENT") return null;
    if (error instanceof HomeTrouble) throw error;
    throw new HomeTrouble(
      "later",
      `${file} cannot be read (${errorCode(error)}). Give this user the right to.`,
    );
  }
}
