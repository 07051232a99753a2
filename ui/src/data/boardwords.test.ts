// What is said of a board.
import { expect, test } from "vitest";
import { asked, bars, boardHeadline, byShare, motorWords, oscillation, partNamed, percent, rangeOf, settingAt, stressedMost, typed, whatItIs } from "./boardwords";
import { board } from "./fixture";

const plain = (s: string) => s.replaceAll("\u00a0", " ");

test("parts by their names", () => {
  expect(["charge", "charge_diode.is", "load.torque_constant", "flyback", "flyback.n", "supply_voltage"].map(partNamed)).toEqual([
    "charge", "charge diode, saturation current", "load, torque constant", "flyback diode", "flyback diode, emission coefficient", "supply voltage"]);
});

test("what the board is", () => {
  expect(plain(whatItIs(board))).toBe("A bipolar timer in the steered network drives a motor of 12 Ω through a MOSFET; the bench’s pot stands in its timing. Rated for 7 V to 12 V.");
  expect(plain(rangeOf(board))).toBe("7 to 12 V and 856 Ω to 82.1 k");
  expect(plain(settingAt(board, board.setting, true))).toBe("9 V, 9.1 k, 27 °C");
});

test("whether it oscillates: everywhere, doubtfully, not everywhere, nowhere", () => {
  expect(plain(oscillation(board))).toBe("It oscillates at all 147 settings looked at, from 7 to 12 V and 856 Ω to 82.1 k, with every one of 1000 boards drawn within tolerance.");
  const at = { supply_voltage: 7, pot: 82e3, temperature: 27 };
  const doubtful = { ...board, oscillation: { settings: 147, never: 0, doubtful: 2, words: "may not oscillate: 12 of 1000 boards drawn within tolerance do not", at } };
  expect(plain(oscillation(doubtful))).toContain("at 2 settings not every board within tolerance does, first at 7 V, 82 k: may not oscillate: 12 of 1000");
  expect(boardHeadline(doubtful)).toContain("may not oscillate everywhere");
  const never = { ...board, oscillation: { settings: 147, never: 3, doubtful: 0, words: "the capacitor never rises", at } };
  expect(plain(oscillation(never))).toBe("It does not oscillate at 3 of the 147 settings looked at, first at 7 V, 82 k: the capacitor never rises.");
  expect(boardHeadline({ ...board, oscillation: { settings: 9, never: 9, doubtful: 0 } })).toBe("Dosing pump driver B does not oscillate");
});

test("what is stressed most, near and above its rating", () => {
  expect(plain(stressedMost(board))).toBe("Stressed most: the timer’s supply voltage, 67 % of 18 V, at 12 V, 856 Ω.");
  const held = (share: number) => ({ ...board, hardest: { ...board.hardest!, held: true, stress: { ...board.hardest!.stress, held_share: share } } });
  expect(plain(stressedMost(held(0.8)))).toContain("80 % of 18 V with the rotor held");
  expect(boardHeadline(held(0.8))).toContain("close to a rating at some");
  expect(boardHeadline(held(1.2))).toContain("overloaded at some");
  expect(stressedMost({ ...board, hardest: undefined })).toBe("No rating of its parts is known.");
  expect([0, 0.004, 0.674].map((s) => plain(percent(s)))).toEqual(["0 %", "below 1 %", "67 %"]);
  const order = byShare(board.stress);
  expect(order[0]!.what).toBe("supply voltage");
  expect(order[order.length - 1]!.rating).toBeUndefined();
});

test("bars: the greatest first, next to nothing only counted", () => {
  const b = bars(board, "duty");
  expect(b.bars.slice(0, 2).map((x) => x.part)).toEqual(["threshold", "charge"]);
  expect(b.bars.every((x, i, all) => i === 0 || Math.abs(x.value) <= Math.abs(all[i - 1]!.value))).toBe(true);
  expect(b.bars.length + b.rest).toBe(board.sensitivities.filter((s) => s.values.duty !== undefined).length);
});

test("where the motor starts and stalls", () => {
  expect(plain(motorWords(board))).toBe("At 9 V the motor starts from rest at every setting of the pot.");
  expect(plain(motorWords({ ...board, flags: [{ name: "stalled", words: "" }] }))).toContain("stands at every setting");
  expect(plain(motorWords({ ...board, starts: 33e3, stalls: 56e3, motor: "between the two it goes on running" }))).toBe("At 9 V the motor just starts from rest at 33 k and just goes on running at 56 k of the pot: between the two it goes on running.");
  expect(motorWords({ ...board, motor: undefined })).toBe("");
});

test("settings as people type them", () => {
  expect(["9", "9 V", "33k", "4.7 kΩ", "4,7k", "−10", "0.35", ""].map(typed)).toEqual([9, 9, 33e3, 4700, 4700, -10, 0.35, undefined]);
  expect(["nine", "9 A", "1e3x", "k"].map(typed)).toEqual([NaN, NaN, NaN, NaN]);
  expect(asked({ supply: "nine", pot: "x", temperature: "27" })).toEqual({ asked: {}, wrong: "The supply and pot can’t be read: write it like 9, 33k or 27." });
});
