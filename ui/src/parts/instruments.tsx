// A line an instrument, and who else is looking.
import { bound } from "../data/format";
import type { Vitals } from "../data/nouns";
import { shortly } from "../data/words";

export function Instruments({ vitals, stale }: { vitals: Vitals | null; stale: boolean }) {
  if (!vitals?.instruments.length) return null;
  return (
    <>
      <h2>{stale ? "Instruments, when last heard" : "Instruments"}</h2>
      <ul class="state">{vitals.instruments.map((a) => <li key={a.name}><span class="k">{shortly(a.name)}</span><span>{bound(a.words)}</span></li>)}</ul>
    </>
  );
}

const words = ["", "One other watches. It", "Two others watch. They", "Three others watch. They"];

export function AlsoHere({ vitals, stale }: { vitals: Vitals | null; stale: boolean }) {
  const others = (vitals?.watchers ?? 0) - 1;
  if (stale || others < 1) return null;
  return (
    <>
      <h2>Also here</h2>
      <p>{words[others] ?? `${others} others watch. They`} cannot disturb the run.</p>
    </>
  );
}
