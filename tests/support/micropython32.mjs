// Runs one script in the 32-bit MicroPython. The job comes as JSON on standard input: where the package is, the
// files to put into the interpreter's file system, the folders to search for modules, and the script.
// An uncaught exception in the script is printed on standard error and ends in exit status 1.

import fs from "node:fs";
import path from "node:path";
import { pathToFileURL } from "node:url";

const job = JSON.parse(fs.readFileSync(0, "utf8"));
const { loadMicroPython } = await import(pathToFileURL(job.module).href);
const micropython = await loadMicroPython({
    heapsize: job.heapsize,
    stdout: (line) => fs.writeSync(1, line + "\n"),
    stderr: (line) => fs.writeSync(2, line + "\n"),
});
for (const [name, text] of Object.entries(job.files)) {
    micropython.FS.mkdirTree(path.posix.dirname(name));
    micropython.FS.writeFile(name, text);
}
try {
    micropython.runPython(`import sys\nsys.path[:0] = ${JSON.stringify(job.search)}\n`);
    micropython.runPython(job.script);
} catch (error) {
    fs.writeSync(2, `${error.message}\n`);
    process.exitCode = 1;
}
