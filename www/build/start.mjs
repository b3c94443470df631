// `npm start`: builds the page and serves it.

import { build } from "./build.mjs";
import { serve } from "./serve.mjs";
import { DIST, runMain } from "./tools.mjs";

await runMain(async () => {
  await build();
  const { url } = await serve(DIST, { port: 8080 });
  console.log(`\nHalfshade is at ${url}\nThe same in one file: dist/halfshade.html\nCtrl+C ends it.`);
});
