import tseslint from "typescript-eslint";

export default tseslint.config(
  { ignores: ["dist/", "node_modules/", "src/data/api.ts"] },
  ...tseslint.configs.recommended,
  {
    rules: {
      // A style attribute written as text would need 'unsafe-inline'; marks take classes and SVG attributes instead.
      "no-restricted-syntax": ["error", { selector: "JSXAttribute[name.name='style']", message: "no style attributes: use a class (style-src 'self')" }],
      eqeqeq: "error",
    },
  },
);
