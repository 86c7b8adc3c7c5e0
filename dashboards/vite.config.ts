/**
 * The pages: built into dist/pages, served by the desk, nothing fetched from anywhere else.
 * Every asset is a file of its own, since the content policy allows nothing inline.
 */
export default {
  base: "/",
  oxc: { jsx: { runtime: "automatic", importSource: "preact" } },
  build: {
    target: "es2022",
    assetsInlineLimit: 0,
    modulePreload: false,
  },
};
