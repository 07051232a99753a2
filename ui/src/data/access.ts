// The operator's token comes in the address's fragment, which no server logs.
// It is taken out of the address bar at once and kept for this tab only.

const key = "nightbench-token";

/** Reads the token; without one the page may only watch. */
export function takeToken(w: Window = window): string {
  const given = new URLSearchParams(w.location.hash.slice(1)).get("token");
  if (given !== null) {
    w.history.replaceState(null, "", w.location.pathname + w.location.search);
    keep(w, given);
    return given;
  }
  return kept(w);
}

// Storage may be forbidden in a private window: then the token lasts as long as the page.
function keep(w: Window, token: string) {
  try {
    w.sessionStorage.setItem(key, token);
  } catch {
    return;
  }
}

function kept(w: Window): string {
  try {
    return w.sessionStorage.getItem(key) ?? "";
  } catch {
    return "";
  }
}
