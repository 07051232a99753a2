// Serves the built page and plays a made-up night through the API, for looking at the page
// without a bench: node dev/practice.mjs [--state running|idle|unconfirmed] [--from POINTS] [--every MS]
import { createHash } from "node:crypto";
import { readFile } from "node:fs/promises";
import { createServer } from "node:http";
import { extname, join, normalize } from "node:path";
import { fileURLToPath } from "node:url";
import { parseArgs } from "node:util";
import { curves, point, record, setpoints } from "./night.mjs";

const { values: opt } = parseArgs({ options: { state: { type: "string", default: "running" }, from: { type: "string", default: "40" }, every: { type: "string", default: "1500" }, port: { type: "string", default: "0" } } });
const dist = fileURLToPath(new URL("../dist", import.meta.url));
const token = "practice-token";
const started = Date.now() - 3 * 3600e3;
const plan = setpoints(), lines = curves(), entries = [], points = [], watchers = new Set();
let energised = "yes", state = "running", since = new Date(started + 9e5), off = null, repeat = 0;

const run = () => ({ id: 41, state, reason: state === "stopped" ? "outputs off was pressed on the page" : "", plan: "Overnight characterisation", board: "Dosing pump driver", revision: "B", board_serial: "0017", bench: "Bench 2", operator: "AK", note: "New capacitor and second-source timer in.", started_at: new Date(started).toISOString(), ended_at: state === "running" ? undefined : new Date().toISOString(), planned: plan.length, measured: points.length, flagged: points.filter((p) => p.readings.some((r) => r.flags.length)).length, pace: 20, seed: 7, version: "development", quantities: Object.keys(lines[0].quantities), instruments: ["Practice Supply, serial 1"], files: [{ role: "plan", name: "overnight.toml", sha256: "0".repeat(64), text: "" }] });
const older = [{ ...run(), id: 40, state: "tripped", reason: "motor current above 0.8 A for 200 ms at 9 V, 1.2 k", measured: 31, flagged: 2, note: "", started_at: new Date(started - 864e5).toISOString(), ended_at: new Date(started - 8e7).toISOString() }, { ...run(), id: 38, state: "done", reason: "", measured: 72, flagged: 1, note: "As delivered. The night to hold others against.", started_at: new Date(started - 40 * 864e5).toISOString(), ended_at: new Date(started - 40 * 864e5 + 3e7).toISOString() }];

function add(kind, more = {}, at = new Date()) {
  const e = { seq: entries.length + 1, run: 41, at: at.toISOString(), elapsed: 0, kind, ...more };
  entries.push(e);
  for (const w of watchers) w.send({ kind: "entry", entry: e });
}
function measure(at = new Date()) {
  const s = plan[points.length];
  if (!s) return end("done");
  if (s.pass % 2 === 0 && s.index && s.pass !== plan[s.index - 1].pass) add("log", { words: `Supply to ${s.supply_voltage} V. Rested 120 s.` }, at);
  const p = point(s, at.toISOString(), 0);
  points.push(p);
  repeat = 0;
  add("point", { point: p }, at);
}
function end(how) {
  state = how; energised = "no"; since = new Date();
  off = { confirmed: true, by: ["supply", "meter average"], voltage: 0.021, below: 0.5, at: since.toISOString(), words: "" };
  add("off", { words: "Off, confirmed by supply and meter average.", off });
  add("ended", { words: `Run 41 ${how}.`, state: how });
}
function vitals() {
  const s = plan[points.length];
  const live = state === "running" && s;
  return { at: new Date().toISOString(), energised, since: since.toISOString(), confirmed_by: off?.by, supply_voltage: energised === "yes" && s ? s.supply_voltage + 0.003 : 0.02, supply_voltage_u: 0.004, supply_current: energised === "yes" ? 0.052 : 0, supply_current_u: 0.001, read_at: new Date(Date.now() - (energised === "unconfirmed" ? 61e3 : 300)).toISOString(), run: live || energised === "unconfirmed" ? 41 : 0, state, doing: live ? `Settling at ${s.supply_voltage} V, ${(s.pot_resistance / 1e3).toPrecision(2)} k; ${repeat} of 5 repeats` : "", detail: live ? `Going ${s.direction}, code ${s.pot_code}. The average moves by 0.4 % over the last 5 readings; 1 % is asked.` : "", setpoint: live ? s : undefined, repeat, repeats: 5, planned: plan.length, measured: points.length, flagged: run().flagged, time_left: live ? (plan.length - points.length) * 240 : undefined, safe_by: live ? new Date(Date.now() + 3e7).toISOString() : undefined, watchers: watchers.size, instruments: [["supply", "answers in 31 ms"], ["average", "integrating, 100 PLC"], ["motor", "answers in 12 ms"], ["scope", "waiting for a trigger"], ["pot", `code ${s?.pot_code ?? 256}, read back`]].map(([name, words]) => ({ name, words })) };
}

add("started", { words: "Started by AK.", setpoints: plan, curves: lines, state: "running" }, new Date(started));
add("energising", { words: "Output on, 5 V." }, since);
while (points.length < Number(opt.from)) measure(new Date(started + 9e5 + points.length * 24e4));
if (opt.state === "idle") end("done");
if (opt.state === "unconfirmed") {
  energised = "unconfirmed"; state = "making_safe";
  add("trip", { words: "Tripped: blind, no good supply state for 2 s.", state });
  add("off", { words: "Off sent. No answer in 0.5 s.", off: { confirmed: false, by: [], voltage: null, below: 0.5, at: new Date().toISOString(), words: "Turn the black switch on the left of the bench." } });
}
if (opt.state === "running") {
  setInterval(() => state === "running" && ++repeat > 5 && measure(), Number(opt.every) / 6);
}
setInterval(() => { const v = vitals(); for (const w of watchers) w.send({ kind: "vitals", vitals: v }); }, 500);

const wiring = { bench: "Bench 2", practice: true, supply: { between: ["supply", "common"], max_voltage: 13, max_current: 1, over_voltage: 14, fuse: 1 }, meters: [{ name: "average", reads: "average_voltage", between: ["load_hi", "load_lo"], burden: 0, calibrated: "2026-03-01", due: "2027-03-01" }, { name: "motor", reads: "motor_current", between: ["flyback_top", "load_hi"], burden: 0.3, calibrated: "2026-03-01", due: "2027-03-01" }], scope: { earthed: true, channels: [{ number: 1, between: ["timer_out", "common"], probe: 10 }] }, pot: { codes: 257, end_to_end: 1e5, tolerance: 0.2, wiper: 75, max_terminal_voltage: 16, max_current: 0.0025, park: 256 } };
const instruments = [["supply", "supply"], ["average", "meter"], ["motor", "meter"], ["scope", "scope"], ["pot", "pot"]].map(([name, role], i) => ({ name, role, address: `serial:///dev/pts/${i}`, dialect: "standard", identity: { maker: "Practice", model: role, serial: String(i + 1), firmware: "1", raw: "" } }));
const api = {
  "/api/status": (may) => ({ version: "development", practice: true, pace: 20, bench: "Bench 2", may_control: may, vitals: vitals(), cautions: [], started_at: new Date(started).toISOString() }),
  "/api/runs": () => ({ runs: [run(), ...older] }),
  "/api/runs/41": () => ({ run: run(), setpoints: plan, curves: lines }),
  "/api/runs/41/points": () => ({ points }),
  "/api/runs/41/log": () => ({ entries: entries.filter((e) => e.kind !== "point").map((e) => ({ ...e, curves: undefined })) }),
  "/api/runs/41/record": () => { const p = points[points.length - 1]; return { point: p.setpoint.index, at: p.at, records: [record(p)] }; },
  "/api/bench": () => ({ wiring, instruments }),
  "/api/boards": () => ({ boards: [] }),
};
const types = { ".html": "text/html", ".js": "text/javascript", ".css": "text/css", ".svg": "image/svg+xml" };
const policy = "default-src 'none'; script-src 'self'; style-src 'self'; img-src 'self'; connect-src 'self'; base-uri 'none'; form-action 'none'; frame-ancestors 'none'";

const server = createServer(async (q, a) => {
  const path = new URL(q.url, "http://x").pathname;
  const may = q.headers.authorization === `Bearer ${token}`;
  const json = (code, o) => a.writeHead(code, { "Content-Type": "application/json" }).end(JSON.stringify(o));
  if (path === "/api/off" && q.method === "POST") {
    if (!may) return json(403, { detail: "only watching is allowed without the operator's token" });
    setTimeout(() => { if (state === "running") end("stopped"); json(200, off ?? { confirmed: false, by: [], voltage: null, below: 0.5, at: new Date().toISOString(), words: "Turn the black switch on the left of the bench." }); }, 400);
    return;
  }
  if (api[path]) return json(200, api[path](may));
  if (path.startsWith("/api/")) return json(404, { detail: `nothing at ${path}` });
  const file = extname(path) ? join(dist, normalize(path)) : join(dist, "index.html");
  readFile(file).then((b) => a.writeHead(200, { "Content-Type": types[extname(file)] ?? "application/octet-stream", "Content-Security-Policy": policy }).end(b), () => a.writeHead(404).end());
});
server.on("upgrade", (q, socket) => {
  const accept = createHash("sha1").update(q.headers["sec-websocket-key"] + "258EAFA5-E914-47DA-95CA-C5AB0DC85B11").digest("base64"); // RFC 6455 section 1.3
  socket.write(`HTTP/1.1 101 Switching Protocols\r\nUpgrade: websocket\r\nConnection: Upgrade\r\nSec-WebSocket-Accept: ${accept}\r\n\r\n`);
  const after = Number(new URL(q.url, "http://x").searchParams.get("after"));
  const w = { send(o) { const b = Buffer.from(JSON.stringify(o)); const h = b.length < 126 ? Buffer.from([0x81, b.length]) : b.length < 65536 ? Buffer.from([0x81, 126, b.length >> 8, b.length & 255]) : Buffer.concat([Buffer.from([0x81, 127, 0, 0, 0, 0]), Buffer.from([b.length >>> 24, (b.length >> 16) & 255, (b.length >> 8) & 255, b.length & 255])]); socket.write(Buffer.concat([h, b])); } };
  socket.once("data", () => { // the hello
    w.send({ kind: "vitals", vitals: vitals() });
    for (const e of entries) if (e.seq > after) w.send({ kind: "entry", entry: e });
    w.send({ kind: "caught_up", seq: entries.length });
    watchers.add(w);
  });
  for (const gone of ["close", "error", "end"]) socket.on(gone, () => { watchers.delete(w); socket.destroy(); });
});
server.listen(Number(opt.port), "127.0.0.1", () => console.log(`http://127.0.0.1:${server.address().port}/#token=${token}`));
