// Flags by their own names, in italic, with the likely cause.
import { bound } from "../data/format";
import type { Point } from "../data/nouns";
import { flagsOf } from "../data/words";

export function Flags({ of }: { of: Point }) {
  return (
    <>
      {flagsOf(of).map((f, i) => (
        <span key={f.name + f.words}>{i > 0 && "; "}<i>{f.name}</i>{f.on.length > 0 && ` (${f.on.join(", ")})`}{f.words && `: ${bound(f.words.replace(/\.$/, ""))}`}</span>
      ))}
    </>
  );
}
