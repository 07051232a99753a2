// Figures are drawn again at the width they get; words in them are never scaled.
import { useLayoutEffect, useRef, useState } from "preact/hooks";

/** A ref for the box that is measured, and its width in px (whole pixels, at least 200). */
export function useWidth<T extends HTMLElement>(first = 960) {
  const ref = useRef<T>(null);
  const [width, setWidth] = useState(first);
  useLayoutEffect(() => {
    const box = ref.current;
    if (!box) return;
    const measure = () => {
      const w = Math.floor(box.getBoundingClientRect().width);
      if (w > 0) setWidth(Math.max(200, w));
    };
    measure();
    const o = new ResizeObserver(measure);
    o.observe(box);
    return () => o.disconnect();
  }, []);
  return [ref, width] as const;
}
