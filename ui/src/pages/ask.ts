// A question to the daemon, asked again when one of `on` changes; the newest answer stays meanwhile.
import { useEffect, useState } from "preact/hooks";

export interface Answer<T> { value: T | null; failed: string }

export function useAnswer<T>(ask: () => Promise<T>, on: readonly unknown[]): Answer<T> {
  const [answer, setAnswer] = useState<Answer<T>>({ value: null, failed: "" });
  useEffect(() => {
    let wanted = true;
    ask().then(
      (value) => wanted && setAnswer({ value, failed: "" }),
      (e: unknown) => wanted && setAnswer((old) => ({ value: old.value, failed: e instanceof Error ? e.message : String(e) })),
    );
    return () => {
      wanted = false;
    };
    // The question itself is a new function at every drawing; what it depends on stands in `on`.
  }, on);
  return answer;
}
