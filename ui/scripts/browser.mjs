// The system's Chromium, and a daemon to look at: one given by BASE_URL and TOKEN, or one started for the purpose.
import { spawn } from "node:child_process";
import { mkdtemp, rm } from "node:fs/promises";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { fileURLToPath } from "node:url";
import { chromium } from "playwright-core";

const quiet = ["--disable-gpu", "--disable-quic", "--no-first-run", "--disable-background-networking", "--disable-component-update", "--disable-sync"];

export function openBrowser() {
  const root = process.getuid?.() === 0; // Chromium's sandbox refuses to run as root
  return chromium.launch({
    executablePath: process.env.CHROMIUM ?? "/usr/bin/chromium",
    headless: true,
    args: root ? [...quiet, "--no-sandbox"] : quiet,
  });
}

/** A daemon's address and token; `close` ends it if it was started here. At pace 5 the sample run lasts about a minute and a half. */
export async function aDaemon(pace = 5) {
  if (process.env.BASE_URL) return { base: process.env.BASE_URL.replace(/\/$/, ""), token: process.env.TOKEN ?? "", close: async () => {} };
  const state = await mkdtemp(join(tmpdir(), "nightbench-"));
  const program = fileURLToPath(new URL("../../nightbench", import.meta.url));
  const child = spawn(program, ["demo", "--state", state, "--listen", "127.0.0.1:0", "--pace", String(pace)], { stdio: ["ignore", "pipe", "pipe"] });
  const gone = new Promise((done) => child.once("exit", done));
  const close = async () => {
    child.kill("SIGINT");
    const late = setTimeout(() => child.kill("SIGKILL"), 10_000);
    await gone;
    clearTimeout(late);
    await rm(state, { recursive: true, force: true });
  };
  try {
    return { ...(await address(child)), close };
  } catch (e) {
    await close();
    throw e;
  }
}

/** The line with the page's address, wherever the program prints it. */
function address(child) {
  return new Promise((resolve, reject) => {
    let said = "";
    const look = (b) => {
      said += b;
      const m = /(http:\/\/127\.0\.0\.1:\d+)\/#token=([\w-]+)/.exec(said);
      if (m) resolve({ base: m[1], token: m[2] });
    };
    child.stdout.on("data", look);
    child.stderr.on("data", look);
    child.once("error", (e) => reject(new Error(`nightbench could not be started (build it first: go build -o nightbench ./daemon): ${e.message}`)));
    child.once("exit", (code) => reject(new Error(`nightbench demo ended with status ${code} before it printed its address:\n${said}`)));
    setTimeout(() => reject(new Error(`no address within 30 s; nightbench demo said:\n${said}`)), 30_000).unref();
  });
}
