// @vitest-environment happy-dom
// The views whole, from the recorded stream: what they say, and that a reader without eyes or mouse gets it too.
import { render } from "preact";
import { act } from "preact/test-utils";
import axe from "axe-core";
import { afterEach, beforeEach, expect, test, vi } from "vitest";
import { board, entries, night, playedBench, vitals } from "../data/fixture";
import type { Bench, Off, Run, Status, Vitals } from "../data/nouns";
import type { Client } from "../data/client";
import { Page } from "./page";
import { newRouter, type Router } from "./router";

const run: Run = { id: 41, state: "running", reason: "", plan: "Overnight", board: "Dosing pump driver", revision: "B", board_serial: "0017", bench: "Bench 2", operator: "AK", note: "New capacitor in.", started_at: "2026-11-30T22:02:00Z", planned: 72, measured: 31, flagged: 3, pace: 20, seed: "7", version: "1", quantities: [], files: [{ role: "plan", name: "overnight.toml", sha256: "ab", text: "" }], instruments: ["Practice supply, serial 1"] };
const status: Status = { version: "1", practice: true, pace: 20, bench: "Bench 2", may_control: true, cautions: [], started_at: run.started_at, vitals };
const wired: Bench = {
  wiring: { bench: "Bench 2", practice: true, supply: { between: ["supply", "common"], max_voltage: 13, max_current: 1, over_voltage: 14, fuse: 1 }, meters: [{ name: "average", reads: "average_voltage", between: ["load_hi", "load_lo"], burden: 0, input_resistance: 0, calibrated: "2026-03-01", due: "2027-03-01" }], },
  instruments: [{ name: "supply", role: "supply", address: "tcp://127.0.0.1:1", dialect: "standard", identity: { maker: "Practice", model: "S", serial: "1", firmware: "1", raw: "" } }, { name: "meter average", role: "meter", address: "tcp://127.0.0.1:2", dialect: "standard", identity: { maker: "", model: "", serial: "", firmware: "", raw: "a meter" } }],
};
const client: Partial<Client> = {
  status: async () => status, runs: async () => [run, { ...run, id: 40, state: "tripped", reason: "motor current above 0.8 A", pace: 1, ended_at: "2026-11-29T01:00:00Z", started_at: "2026-10-28T22:00:00Z" }],
  run: async () => ({ run, setpoints: [...night.setpoints], curves: [...night.curves] }), points: async () => [...night.points], log: async () => entries.filter((e) => e.kind !== "point"),
  record: async () => null, bench: async () => wired, boards: async () => [board.board], board: async () => board,
};

class NoResize {
  observe() {}
  unobserve() {}
  disconnect() {}
}

let routers: Router[] = [];
beforeEach(() => {
  vi.stubGlobal("ResizeObserver", NoResize);
  document.documentElement.lang = "en";
  document.body.innerHTML = '<div id="page"></div>';
});
afterEach(() => {
  vi.useRealTimers();
  act(() => render(null, document.getElementById("page")!));
  for (const r of routers) r.close();
  routers = [];
});

const settle = () => act(async () => new Promise((r) => setTimeout(r, 80)));

async function opened(path: string, more: { vitals?: Partial<Vitals>; token?: string; client?: Partial<Client> } = {}) {
  history.replaceState(null, "", path);
  const played = playedBench({ ...client, ...more.client }, more.token);
  const router = newRouter();
  routers.push(router);
  act(() => render(<Page bench={played.bench} client={{ ...client, ...more.client } as Client} router={router} />, document.getElementById("page")!));
  await act(async () => {
    played.heard.live();
    played.heard.vitals({ ...vitals, ...more.vitals });
    for (const e of entries) played.heard.entry(e);
    played.heard.caughtUp(entries.at(-1)!.seq);
  });
  await settle();
  return played;
}

const text = (sel: string) => (document.querySelector(sel)?.textContent ?? "").replaceAll("\u00a0", " ");

// Colour needs a real layout and is computed in the concept's table of tokens; the rest is checked here.
async function accessible() {
  const found = await axe.run(document, { rules: { "color-contrast": { enabled: false } } });
  return found.violations.map((v) => `${v.id}: ${v.nodes.map((n) => n.html).join(" ")}`);
}

test.each(["/", "/runs", "/runs/41", "/bench", "/boards", `/boards/${"0a".repeat(32)}`, "/elsewhere"])("%s has state, progress, pace, Outputs off, one h1, and no barrier", async (path) => {
  await opened(path);
  expect(text(".standing .say p")).toMatch(/^Energised\. Output on since \d\d:\d\d; supply reads 9\.0030\(40\) V/);
  expect(text(".standing .say .sub")).toContain("Run 41: 31 of 72 points, 3 flagged.");
  expect(text(".run-head .pace")).toBe("Practice bench at 20 × speed");
  expect(text(".offbox button")).toBe("Outputs off");
  expect(document.querySelectorAll("h1")).toHaveLength(1);
  expect(document.querySelectorAll("[style]")).toHaveLength(0);
  expect(document.querySelectorAll('[aria-live="polite"]')).toHaveLength(1);
  expect(text("footer")).toContain("no emergency stop");
  expect(await accessible()).toEqual([]);
});

test("Now draws measured points and predictions, and the choice of quantity follows the address", async () => {
  await opened("/?quantity=duty");
  expect(document.querySelectorAll("main figure .pencil")).toHaveLength(3);
  expect(document.querySelectorAll("main figure circle.pt").length).toBeGreaterThanOrEqual(31);
  expect(text(".picker [aria-current]")).toBe("duty");
  expect(document.querySelector("main figure svg")!.getAttribute("aria-label")).toContain("31 points measured");
  act(() => document.querySelector<HTMLAnchorElement>('.picker a[href$="frequency"]')!.click());
  expect(text(".picker [aria-current]")).toBe("frequency");
  expect(text(".log")).toContain("flagged roads disagree (average voltage): meter and scope differ by 3.6 u");
});

test("the points behind a figure are there as a table", async () => {
  await opened("/");
  const behind = document.querySelector<HTMLDetailsElement>("details.behind")!;
  await act(async () => {
    behind.open = true;
    behind.dispatchEvent(new Event("toggle"));
  });
  expect(behind.querySelectorAll("tbody tr")).toHaveLength(31);
  expect(await accessible()).toEqual([]);
});

test("not live: said first, figures marked, 'now' becomes 'then', and back by itself", async () => {
  const { heard } = await opened("/");
  await act(async () => heard.lost(Date.parse("2026-12-01T02:14:00Z")));
  expect(text(".standing strong")).toBe("Not live since 02:14:00.");
  expect(text("h1")).toContain("Last heard at 02:14:00");
  expect(document.querySelector(".sheet.stale")).not.toBeNull();
  expect(text("main figure svg")).toContain("then: ");
  await act(async () => heard.live());
  expect(document.querySelector(".sheet.stale")).toBeNull();
});

test.each(["/", "/runs"])("off not confirmed is an alert in its double frame on %s, with the switch in words", async (path) => {
  const { heard } = await opened(path, { vitals: { energised: "unconfirmed", state: "making_safe" } });
  const off: Off = { confirmed: false, by: [], voltage: null, below: 0.5, at: "2026-12-01T03:07:12Z", words: "Turn the black switch on the left of the bench." };
  await act(async () => heard.entry({ seq: night.seq + 1, run: 41, at: off.at, elapsed: 0, kind: "off", words: "Off sent.", off }));
  await settle();
  expect(text('.alarm[role="alert"]')).toContain("Off is not confirmed. Turn the black switch on the left of the bench.");
  expect(document.querySelectorAll("h1")).toHaveLength(1);
  expect(await accessible()).toEqual([]);
});

test("pressing Outputs off says what came of it; a watcher is told why it can't act", async () => {
  const off: Off = { confirmed: true, by: ["supply"], voltage: 0.02, below: 0.5, at: "2026-12-01T02:14:04Z", words: "" };
  await opened("/bench", { client: { off: async () => off } });
  await act(async () => document.querySelector<HTMLButtonElement>(".offbox button")!.click());
  expect(text(".outcome")).toContain("Off confirmed at 02:14:04 by supply");
  act(() => render(null, document.getElementById("page")!));
  await opened("/", { token: "" });
  const button = document.querySelector<HTMLButtonElement>(".offbox button")!;
  expect(button.getAttribute("aria-disabled")).toBe("true");
  expect(text("#off-why")).toContain("no operator’s token");
  expect(text(".standing .say")).toContain("no operator’s token");
  await act(async () => button.click());
  expect(text(".outcome")).toContain("no operator’s token");
  expect(text(".offbox .brief")).toContain("no operator’s token");
  expect(await accessible()).toEqual([]);
});

test("the state is spoken when it changes, but not twice in 15 s", async () => {
  const { heard } = await opened("/");
  expect(text(".spoken[aria-live]")).toMatch(/^Energised\./);
  vi.useFakeTimers();
  const pass = (ms: number) => act(async () => void (await vi.advanceTimersByTimeAsync(ms)));
  await act(async () => heard.lost(Date.parse("2026-12-01T02:14:00Z")));
  await pass(16_000);
  expect(text(".spoken[aria-live]")).toMatch(/^Not live since 02:14:00\./);
  await act(async () => heard.live());
  await pass(10_000);
  expect(text(".spoken[aria-live]")).toMatch(/^Not live/);
  await pass(6_000);
  expect(text(".spoken[aria-live]")).toMatch(/^Energised\./);
});

test("a run that starts while the page is open is the one shown", async () => {
  const { heard } = await opened("/");
  const at = "2026-12-01T08:00:00Z";
  await act(async () => {
    heard.entry({ seq: night.seq + 1, run: 42, at, elapsed: 0, kind: "started", words: "Started by BL.", state: "preparing", setpoints: night.setpoints.slice(0, 12), curves: [...night.curves] });
    heard.vitals({ ...vitals, run: 42, state: "preparing", doing: "Preparing run 42", measured: 0, flagged: 0, planned: 12, repeat: 0, setpoint: undefined });
  });
  await settle();
  expect(text("h1")).toBe("Preparing run 42");
  expect(text(".log")).not.toContain("duty");
  expect(document.querySelectorAll("main figure .dots circle")).toHaveLength(0);
  expect(document.querySelector(".tally")!.getAttribute("aria-label")).toBe("0 of 12 points. 0 flagged, 0 lost");
});

test("when nothing runs the answer is how the last one went", async () => {
  const { heard } = await opened("/", { vitals: { run: 0, state: "done", energised: "no", since: "2026-12-01T06:31:08Z", confirmed_by: ["supply", "meter average"] }, client: { run: async () => ({ run: { ...run, state: "done", ended_at: "2026-12-01T06:31:10Z" }, setpoints: [], curves: [] }) } });
  await act(async () => heard.entry({ seq: night.seq + 1, run: 41, at: "2026-12-01T06:31:10Z", elapsed: 0, kind: "ended", words: "Done.", state: "done" }));
  await settle();
  expect(text("h1")).toBe("Run 41 is done");
  expect(text(".standing .say p")).toBe("Not energised. Output off since 06:31:08, confirmed by supply and meter average.");
  expect(document.querySelector(".off")!.classList.contains("again")).toBe(true);
});

test("a run's page has its points, flags in words, and what it was measured with", async () => {
  await opened("/runs/41");
  expect(document.querySelectorAll("table.points tbody tr:not(.why)")).toHaveLength(31);
  expect(text("table.points .why")).toContain("unsettled (average voltage): still moving by 1.6 % after 20 s");
  expect(text("table.plain")).toContain("overnight.toml");
});

test("an answer that fails is said in words", async () => {
  await opened("/runs", { client: { runs: () => Promise.reject(new Error("The daemon did not answer.")) } });
  expect(text("main .caution")).toBe("The list could not be read: The daemon did not answer.");
});

test("Boards answers in words first, then draws staff, curves, bars and stress", async () => {
  await opened("/boards?quantity=duty");
  expect(text("h1")).toBe("Dosing pump driver B oscillates at every setting, and every known rating is kept");
  expect(text(".lead")).toContain("Stressed most: the timer’s supply voltage, 67 % of 18 V, at 12 V, 856 Ω.");
  expect(text(".run-head [aria-current]")).toBe("Boards");
  const svgs = [...document.querySelectorAll("main svg[role=img]")].map((e) => e.getAttribute("aria-label"));
  expect(svgs[0]).toBe("Schematic: 11 parts between 9 nodes. The parts are listed below it.");
  expect(svgs[1]!.replaceAll("\u00a0", " ")).toMatch(/^Duty cycle against pot resistance at 7 V, 9 V and 12 V, predicted, .* At 9 V, 9.1 k it is 0.6989/);
  expect(document.querySelectorAll("main figure .pencil")).toHaveLength(3);
  expect(text("table.bars tbody tr")).toContain("threshold");
  expect(text("table.stress tbody tr")).toMatch(/^timersupply voltage9 V9 V18 V50 %/);
  expect(text(".margin")).toContain("Nothing: no rating is above 70 %");
});

test("a board is computed where the form says, and the quantity stays", async () => {
  const asked: unknown[] = [];
  await opened("/boards?quantity=duty", { client: { board: async (_, at) => (asked.push(at), board) } });
  const form = document.querySelector<HTMLFormElement>("form.setting")!;
  form.querySelector<HTMLInputElement>("[name=pot]")!.value = "33k";
  await act(async () => void form.dispatchEvent(new Event("submit", { bubbles: true, cancelable: true })));
  await settle();
  expect(asked[asked.length - 1]).toEqual({ supply: 9, pot: 33e3, temperature: 27 });
  expect(location.search).toContain("quantity=duty");
  expect(document.querySelector<HTMLAnchorElement>('.picker a[href*="frequency"]')!.search).toContain("pot=33k");
});

test("what was typed and can't be read is said, and nothing is computed in its place", async () => {
  await opened("/boards?supply=nine", { client: { board: () => Promise.reject(new Error("asked all the same")) } });
  expect(text("main .caution")).toBe("The supply can’t be read: write it like 9, 33k or 27.");
});

test("a board that does not oscillate, and a bench without boards, say so", async () => {
  const still = { ...board, sensitivities: [], stress: [], hardest: undefined, values: {}, oscillation: { settings: 147, never: 147, doubtful: 0, words: "does not oscillate: the capacitor never rises", at: board.setting } };
  await opened("/boards", { client: { board: async () => still } });
  expect(text("h1")).toBe("Dosing pump driver B does not oscillate");
  expect(text("main")).toContain("no stress is computed");
  expect(await accessible()).toEqual([]);
  act(() => render(null, document.getElementById("page")!));
  await opened("/boards", { client: { boards: async () => [] } });
  expect(text("h1")).toBe("No board has been measured here yet");
});
