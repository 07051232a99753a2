import { defineConfig } from "vitest/config";

// The page is served under a strict policy (style-src 'self', script-src 'self'):
// nothing is inlined, neither as data: addresses nor as a preload helper.
export default defineConfig({
  oxc: { jsx: { runtime: "automatic", importSource: "preact" } },
  build: {
    target: "es2022",
    assetsInlineLimit: 0,
    modulePreload: { polyfill: false },
    emptyOutDir: true,
  },
  test: {
    environment: "node", // a test that needs a document says so in its first line
    testTimeout: 20_000,
    include: ["src/**/*.test.{ts,tsx}"],
    env: { TZ: "UTC" },
    restoreMocks: true,
  },
});
