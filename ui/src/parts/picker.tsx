// The choice of quantity: links, so that the keyboard, the back button and a bookmark work.
import type { Quantity } from "../data/nouns";
import { named } from "../data/words";

export function Picker({ quantities, chosen, at }: { quantities: readonly Quantity[]; chosen: Quantity; at: string }) {
  if (quantities.length < 2) return null;
  return (
    <nav class="picker" aria-label="Quantity">
      {quantities.map((q) => <a key={q} href={`${at}${at.includes("?") ? "&" : "?"}quantity=${q}`} aria-current={q === chosen ? "true" : undefined}>{named(q)}</a>)}
    </nav>
  );
}
