// A small static server for dist/, for this computer only.

import { createReadStream } from "node:fs";
import { stat } from "node:fs/promises";
import { createServer } from "node:http";
import { extname, join, normalize, sep } from "node:path";

/** @type {Record<string, string>} */
const TYPES = {
  ".html": "text/html; charset=utf-8",
  ".css": "text/css; charset=utf-8",
  ".js": "text/javascript; charset=utf-8",
  ".json": "application/json; charset=utf-8",
  ".txt": "text/plain; charset=utf-8",
  ".ts": "text/plain; charset=utf-8",
  ".md": "text/plain; charset=utf-8",
  ".py": "text/plain; charset=utf-8",
  ".wasm": "application/wasm",
};

/**
 * Serves a folder.
 * @param {string} folder
 * @param {{ port?: number, path?: string }} [options] first port to try (0: any free one), and the
 *   path under which the folder appears, with a slash at both ends
 * @returns {Promise<{ url: string, close: () => Promise<void> }>}
 */
export async function serve(folder, { port = 0, path = "/" } = {}) {
  const server = createServer((request, response) => {
    answer(folder, path, request, response).catch(() => {
      if (!response.headersSent) response.writeHead(404, { "Content-Type": "text/plain" });
      response.end("There is nothing here.\n");
    });
  });
  for (let candidate = port; ; candidate += 1) {
    const failure = await listen(server, candidate);
    if (!failure) break;
    if (failure.code !== "EADDRINUSE" || candidate > port + 100) throw failure;
  }
  const address = server.address();
  const actual = typeof address === "object" && address ? address.port : port;
  return {
    url: `http://localhost:${actual}${path}`,
    close: () =>
      new Promise((resolve) => {
        server.close(() => resolve());
        server.closeAllConnections();
      }),
  };
}

/**
 * @param {string} folder
 * @param {string} prefix
 * @param {import("node:http").IncomingMessage} request
 * @param {import("node:http").ServerResponse} response
 */
async function answer(folder, prefix, request, response) {
  const { pathname } = new URL(request.url ?? "/", "http://localhost");
  if (request.method !== "GET" && request.method !== "HEAD") throw new Error("method");
  if (!pathname.startsWith(prefix)) throw new Error("outside");
  const relative = decodeURIComponent(pathname.slice(prefix.length));
  const file = normalize(join(folder, relative === "" || relative.endsWith("/") ? `${relative}index.html` : relative));
  if (!file.startsWith(normalize(folder + sep))) throw new Error("outside");
  const entry = await stat(file);
  if (!entry.isFile()) throw new Error("no file");
  response.writeHead(200, {
    "Content-Type": TYPES[extname(file)] ?? "application/octet-stream",
    "Content-Length": entry.size,
    "Cache-Control": "no-cache",
  });
  if (request.method === "HEAD") response.end();
  else createReadStream(file).pipe(response);
}

/**
 * @param {import("node:http").Server} server
 * @param {number} port
 * @returns {Promise<NodeJS.ErrnoException | undefined>} the failure, if it failed
 */
function listen(server, port) {
  return new Promise((resolve) => {
    server.once("error", resolve);
    server.listen(port, "127.0.0.1", () => {
      server.off("error", resolve);
      resolve(undefined);
    });
  });
}
