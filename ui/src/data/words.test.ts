import { expect, test } from "vitest";
import { night, vitals } from "./fixture";
import { nbsp } from "./format";
import type { Run, Status, Vitals } from "./nouns";
import { benchNamed, briefProgress, doingNow, flagsOf, headline, type Link, listed, named, pace, pointWords, progress, sentence, sentenceCase, standing, tallied } from "./words";

const plain = (s: string) => s.replaceAll(nbsp, " ");
const live: Link = { state: "live" };
const base: Vitals = {
  ...vitals, at: "2026-12-01T02:00:00Z", energised: "yes", since: "2026-11-30T22:24:00Z", run: 41, state: "running",
  supply_voltage: 9.003, supply_voltage_u: 0.004, supply_current: 0.052, supply_current_u: 0.001, read_at: "2026-12-01T01:58:07Z",
  measured: 63, planned: 144, flagged: 4, time_left: 16_200, safe_by: "2026-12-01T07:02:00Z",
};

test("energised, with its evidence", () => {
  const s = standing(base, live);
  expect([s.word, s.evidence, plain(s.live)]).toEqual(["Energised.", "Output on since 22:24", "9.0030(40) V, 52.0(10) mA"]);
  expect(plain(progress(base, live, "Bench 2"))).toBe("Run 41: 63 of 144 points, 4 flagged. About 4 h 30 min left, done near 06:30; safe by 07:02 whatever remains.");
  expect(plain(briefProgress(base))).toBe("63 of 144, 4 h 30 min left");
});

test("a run that stands still says so instead of a time", () => {
  const said = (state: Vitals["state"]) => progress({ ...base, flagged: 0, state }, live, "").replace("Run 41: 63 of 144 points. ", "");
  expect(said("held")).toBe("Held: the output is off until the run is continued.");
  expect(said("asking")).toBe("It waits for a person.");
  expect(said("making_safe")).toBe("Making safe.");
});

test("off is a claim with a witness", () => {
  const v: Vitals = { ...base, energised: "no", since: "2026-12-01T06:31:08Z", confirmed_by: ["supply", "meter", "cutoff"], run: 0, state: undefined };
  expect(standing(v, live).evidence).toBe("Output off since 06:31:08, confirmed by supply, meter and cutoff.");
  expect(progress(v, live, "Bench 2")).toBe("Nothing is running on Bench 2.");
});

test("unconfirmed and not live carry the word, and caution", () => {
  expect(standing({ ...base, energised: "unconfirmed" }, live)).toMatchObject({ word: "Unconfirmed.", caution: true });
  const lost: Link = { state: "lost", since: "2026-12-01T02:14:09Z" };
  const s = standing(base, lost);
  expect(s).toMatchObject({ word: "Not live since 02:14:09.", caution: true });
  expect(plain(s.evidence)).toBe("When last heard: energised, output on, 9 V. This page tries again every 5 s.");
  expect(progress(base, lost, "")).toContain("may not get through");
  expect(standing(null, { state: "connecting" }).evidence).toBe("Waiting for the bench’s first answer.");
});

test("pace is said when it is not 1", () => {
  const s = { practice: true, pace: 20 } as Status;
  expect(plain(pace(s))).toBe("Practice bench at 20 × speed");
  expect(pace({ ...s, pace: 1 })).toBe("Practice bench");
  expect(pace({ ...s, practice: false, pace: 1 })).toBe("");
  expect(pace(null)).toBe("");
});

test("a point in words; the supply is said where it changes", () => {
  const [good, bad] = [night.points[0]!, night.points[10]!];
  expect(plain(pointWords(good))).toMatch(/^5 V, 1\.\d+ k: 4\.\d+\(\d+\) V, duty 0\.8\d+\(\d+\)\. Good\.$/);
  expect(plain(pointWords(good, true))).toMatch(/^1\.\d+ k: /);
  expect(pointWords(bad)).toMatch(/, flagged $/);
  expect(flagsOf(bad)).toMatchObject([{ name: "unsettled", on: ["average voltage"] }]);
  const every = { ...bad, readings: bad.readings.map((r) => ({ ...r, flags: [{ name: "unsettled", words: "after 20 s" }] })) };
  expect(flagsOf(every)).toEqual([{ name: "unsettled", words: "after 20 s", on: [] }]);
});

test("the headline counts repeats where the run does not say them itself", () => {
  expect(plain(doingNow({ ...base, doing: "Measuring at 9 V, 21.6 k", repeat: 3, repeats: 8 }))).toBe("Measuring at 9 V, 21.6 k; 3 of 8 repeats");
  expect(plain(doingNow({ ...base, doing: "Settling at 9 V, 21.6 k", repeat: 0, repeats: 8 }))).toBe("Settling at 9 V, 21.6 k");
  expect(doingNow({ ...base, doing: "", repeat: 0, state: "making_safe" })).toBe("Making safe");
  expect(doingNow({ ...base, doing: "2 of 8 repeats", repeat: 2, repeats: 8 })).toBe("2 of 8 repeats");
});

test("lists, names, headlines", () => {
  expect([listed([]), listed(["a"]), listed(["a", "b"]), listed(["a", "b", "c"])]).toEqual(["", "a", "a and b", "a, b and c"]);
  expect([sentence("outputs off, by AK"), sentence("Off."), sentence("")]).toEqual(["Outputs off, by AK.", "Off.", ""]);
  expect([benchNamed("Bench 2"), benchNamed("Practice bench"), benchNamed("")]).toEqual(["Bench 2", "the practice bench", "the bench"]);
  expect([named("output_drop"), sentenceCase("off")]).toEqual(["output drop", "Off"]);
  expect(headline(null)).toBe("Nothing has been measured here yet");
  expect(headline({ id: 7, state: "tripped" } as Run)).toBe("Run 7 tripped");
  expect(headline({ id: 7, state: "making_safe" } as Run)).toBe("Run 7 is making safe");
  expect([tallied({ measured: 144, planned: 144, flagged: 0 }), tallied({ measured: 61, planned: 144, flagged: 2 })]).toEqual(["144 points.", "61 of 144 points, 2 flagged."]);
});
