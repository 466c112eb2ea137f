// Opens reports in Chromium and uses them as readers do: with mouse, keyboard
// and touch, on a phone and on a wide screen, in light and dark, on paper.
//
//     node run.mjs PATH_TO_COREWRIGHT [ONLY TESTS WITH THIS IN THEIR NAME]
//
// What is asserted comes from schemes.json, from WCAG 2.2 (reflow at 360 px,
// pausing of motion, the rules of axe-core) and from ISO 216 (A3, A4).

import assert from "node:assert/strict";
import { execFileSync } from "node:child_process";
import { existsSync, mkdtempSync, readFileSync, rmSync, writeFileSync } from "node:fs";
import { createRequire } from "node:module";
import { tmpdir } from "node:os";
import { dirname, join, resolve } from "node:path";
import { fileURLToPath, pathToFileURL } from "node:url";
import { chromium } from "playwright-core";

const axe = readFileSync(createRequire(import.meta.url).resolve("axe-core/axe.min.js"), "utf8");
const towers = resolve(dirname(fileURLToPath(import.meta.url)), "../towers");
const program = resolve(process.argv[2] ?? "");
const chrome = process.env.CHROMIUM ?? "/usr/bin/chromium";
assert(process.argv[2] && existsSync(program), "name the corewright program to test");
assert(existsSync(chrome), `${chrome} is missing (Debian package chromium)`);

const desk = mkdtempSync(join(tmpdir(), "corewright-browser-"));
// Exit code 1 is an answer ("does not pass") as good as 0.
const corewright = (...words) => {
  try {
    execFileSync(program, words, { cwd: desk, stdio: ["ignore", "ignore", "pipe"] });
  } catch (error) {
    if (error.status !== 1) throw error;
  }
};

// Towers of tests/towers: one that must be mended, one with outriggers and belts.
const lantern = readFileSync(join(towers, "low_lantern.toml"), "utf8");
assert(lantern.includes("limit = 0.9,"));
writeFileSync(join(desk, "twisting.toml"), lantern.replace("limit = 0.9,", "limit = 0.68,"));
corewright("propose", "twisting.toml", "--out", "twisting", "--quiet");
corewright("propose", join(towers, "short.toml"), "--out", "arms", "--max-analyses", "60", "--schemes", "3", "--quiet");
corewright("check", join(towers, "setback.toml"), "--report", "one.html");

// The page comes from the results alone: made again it is the same.
const first = readFileSync(join(desk, "twisting/report.html"), "utf8");
corewright("report", "twisting");
assert.equal(readFileSync(join(desk, "twisting/report.html"), "utf8"), first, "report is not what propose wrote");

const results = (name) => JSON.parse(readFileSync(join(desk, name, "schemes.json"), "utf8"));
const pages = [
  { name: "twisting", file: join(desk, "twisting/report.html"), json: results("twisting") },
  { name: "arms", file: join(desk, "arms/report.html"), json: results("arms") },
  { name: "one tower", file: join(desk, "one.html") },
];
assert(pages[0].json.schemes.length >= 1 && pages[0].json.schemes[0].changes.length >= 1);

const browser = await chromium.launch({
  executablePath: chrome,
  args: ["--no-sandbox", "--disable-gpu", "--disable-dev-shm-usage"],
});

/** A page whose every complaint, and every call for a network, is a failure. */
async function open(file, options = {}) {
  const context = await browser.newContext({ viewport: { width: 1366, height: 900 }, ...options });
  const page = await context.newPage();
  page.complaints = [];
  page.on("console", (message) => page.complaints.push(`console: ${message.text()}`));
  page.on("pageerror", (error) => page.complaints.push(`error: ${error.message}`));
  page.on("request", (request) => {
    if (request.url() !== pathToFileURL(file).href) page.complaints.push(`asks for ${request.url()}`);
  });
  await page.goto(pathToFileURL(file).href);
  return page;
}

async function close(page) {
  assert.deepEqual(page.complaints, []);
  await page.context().close();
}

let count = 0;
const only = process.argv[3] ?? "";
async function test(name, work) {
  if (!name.includes(only)) return;
  await work();
  count += 1;
  console.log(`ok ${count} - ${name}`);
}

/** A shown number is that of the results, rounded as shown. */
function assertShown(text, value, where) {
  const shown = text.replace(/(\d)[\s\u202f](?=\d)/g, "$1").match(/[+-]?(1\/)?\d+(\.\d+)?/)[0];
  const slope = shown.startsWith("1/");
  const digits = slope ? shown.slice(2) : shown;
  const decimals = (digits.split(".")[1] ?? "").length;
  const number = slope ? 1 / value : value;
  assert(
    Math.abs(Number(digits) - number) <= 0.5 * 10 ** -decimals * (1 + 1e-6),
    `${where}: ${text} is shown, ${value} is meant`,
  );
}

try {
  for (const { name, file } of pages) {
    for (const [width, colorScheme, axed] of [
      [360, "light", true], [360, "dark", false], [390, "light", false], [768, "light", false],
      [1024, "dark", false], [1366, "light", true], [1366, "dark", true], [1587, "light", false],
    ]) {
      await test(`${name} at ${width} px, ${colorScheme}: no overflow${axed ? ", accessible" : ""}`, async () => {
        const page = await open(file, { viewport: { width, height: 900 }, colorScheme });
        const ids = await page.$$eval("article.tower", (list) => list.map((one) => one.id));
        for (const id of ids) {
          if (ids.length > 1) await page.check(`input[name=tower][value=${id}]`, { force: true });
          const wide = await page.evaluate(() => document.documentElement.scrollWidth);
          assert(wide <= width, `${id} is ${wide} px wide`);
        }
        if (axed) {
          await page.addStyleTag({ content: "*{animation:none!important}" });
          await page.evaluate(axe);
          const { violations } = await page.evaluate(() => globalThis.axe.run());
          const grave = violations.filter((one) => ["serious", "critical"].includes(one.impact));
          const told = grave.map((one) => `${one.id}: ${one.nodes.slice(0, 3).map((node) => node.html.slice(0, 160)).join(" | ")}`);
          assert.deepEqual(told, []);
        }
        await close(page);
      });
    }

    await test(`${name}: every picture has a title and a description`, async () => {
      const page = await open(file);
      const mute = await page.$$eval("svg:not([aria-hidden])", (list) => list.filter((svg) => {
        const told = (key) => document.getElementById(svg.getAttribute(key))?.textContent.trim();
        return !told("aria-labelledby") || !told("aria-describedby");
      }).map((svg) => svg.id));
      assert.deepEqual(mute, []);
      const ids = await page.$$eval("[id]", (list) => list.map((one) => one.id).filter((id) => id !== "worse"));
      assert.equal(new Set(ids).size, ids.length, "an id stands twice");
      await close(page);
    });

    await test(`${name}: still in print and where motion is unwelcome, moving elsewhere until paused`, async () => {
      const motion = (page) => page.$eval(".sway", (one) => getComputedStyle(one).animationName);
      const page = await open(file);
      assert.equal(await motion(page), "sway");
      await page.click("#motion");
      assert.equal(await motion(page), "none");
      await page.click("#motion");
      await page.emulateMedia({ media: "print" });
      assert.equal(await motion(page), "none");
      await close(page);
      const calm = await open(file, { reducedMotion: "reduce" });
      assert.equal(await motion(calm), "none");
      await close(calm);
    });

    await test(`${name}: prints on A4 and A3`, async () => {
      const page = await open(file);
      const articles = await page.$$eval("article.tower", (list) => list.length);
      const sheets = async (format, landscape) => {
        const pdf = (await page.pdf({ format, landscape, printBackground: true, preferCSSPageSize: false })).toString("latin1");
        // ISO 32000-1, 7.7.3.3: each sheet is an object of type Page.
        return [...pdf.matchAll(/\/Type\s*\/Page(?![a-zA-Z])/g)].length;
      };
      const a4 = await sheets("A4", false);
      const a3 = await sheets("A3", true);
      // A sheet of its own for each tower, for the start and for the end.
      assert(a4 >= articles + 2 && a4 <= 7 * articles + 5, `A4: ${a4} sheets of ${articles} towers`);
      assert(a3 >= articles + 2 && a3 <= a4, `A3: ${a3} sheets, A4: ${a4}`);
      await page.emulateMedia({ media: "print" });
      const hidden = await page.$$eval("article.tower, .band", (list) => list.filter((one) => !one.checkVisibility()).length);
      assert.equal(hidden, 0, "print hides something");
      await close(page);
    });

    await test(`${name}: without scripts everything is shown`, async () => {
      const page = await open(file, { javaScriptEnabled: false });
      for (const article of await page.locator("article.tower").all()) assert(await article.isVisible());
      for (const band of await page.locator(".band").all()) assert(await band.isVisible());
      await close(page);
    });

    await test(`${name}: values by mouse, keyboard and touch`, async () => {
      const page = await open(file, { hasTouch: true });
      const figure = page.locator("article.tower.shown figure.band.shown");
      const readout = figure.locator(".readout");
      const marks = figure.locator(".mark:has(polygon.wall)");
      const words = await marks.locator("title").allTextContents();
      assert(words.length >= 2);
      const wall = (at) => marks.nth(at).locator("polygon").first();
      await wall(0).hover({ force: true });
      assert.equal(await readout.textContent(), words[0]);
      await wall(1).tap({ force: true });
      assert.equal(await readout.textContent(), words[1]);
      const all = await figure.locator(".mark title").allTextContents();
      await figure.locator("svg").focus();
      await page.keyboard.press("ArrowRight");
      const next = all[(all.indexOf(words[1]) + 1) % all.length];
      assert.equal(await readout.textContent(), next);
      await page.keyboard.press("ArrowLeft");
      assert.equal(await readout.textContent(), words[1]);
      await close(page);
    });
  }

  for (const { name, file, json } of pages.filter((page) => page.json)) {
    const designs = [
      { id: "given", of: json.given, added: 0, changes: [] },
      ...json.schemes.map((scheme) => ({
        id: `scheme-${scheme.rank}`, of: scheme, added: scheme.added_concrete_m3, changes: scheme.changes,
      })),
    ];

    await test(`${name}: all numbers are those of schemes.json`, async () => {
      const page = await open(file);
      let compared = 0;
      const compare = (cell, value, where) => {
        assert.equal(Number(cell.value), value, where);
        assertShown(cell.text, value, where);
        compared += 1;
      };
      const cells = (query) => page.$$eval(query, (rows) => rows.map((row) => [...row.cells].map((cell) => ({
        text: cell.firstChild?.nodeType === 3 ? cell.firstChild.textContent : cell.textContent,
        all: cell.textContent, value: cell.dataset.value,
      }))));
      for (const { id, of, added, changes } of designs) {
        const [row] = await cells(`#designs tr[data-design=${id}]`);
        const bounded = json.bound?.gap_percent?.some((gap) => gap !== null) ? 1 : 0;
        compare(row[2], added, `${id}: added`);
        if (bounded && id !== "given") {
          const gap = json.bound.gap_percent[of.rank - 1];
          if (gap !== null) compare(row[3], gap, `${id}: gap`);
        }
        const rest = row.slice(3 + bounded);
        compare(rest[0], of.periods.x_s, `${id}: X`);
        compare(rest[1], of.periods.y_s, `${id}: Y`);
        compare(rest[2], of.periods.twist_s, `${id}: torsion`);
        compare(rest[3], of.ratio_to_smaller, `${id}: ratio`);
        assert.equal(rest[4].all, of.governing);
        compare(rest[5], of.checks.find((check) => check.name === of.governing).utilisation, `${id}: used`);
        compare(rest[6], changes.length, `${id}: changes`);
        if (id !== "given") compare(rest[7], of.floor_area_lost_m2, `${id}: wall area`);
        compare(rest[8], of.quantities.total_m3, `${id}: concrete`);

        const checks = await cells(`#${id} table.checks tbody tr`);
        assert.equal(checks.length, of.checks.length);
        for (const line of checks) {
          const check = of.checks.find((one) => one.name === line[0].all);
          if (check.off) assert.equal(line[1].all, "switched off");
          else assert.equal(line[1].all, check.passes ? "passes" : "fails");
          compare(line[2], check.demand, `${id}, ${check.name}: demand`);
          compare(line[3], check.limit, `${id}, ${check.name}: limit`);
          compare(line[4], check.utilisation, `${id}, ${check.name}: used`);
          assert.equal(line[6].all, check.clause);
        }
        const modes = await cells(`#${id} table.modes tbody tr`);
        assert.equal(modes.length, of.modes.length);
        modes.forEach((line, at) => {
          const mode = of.modes[at];
          compare(line[1], mode.period_s, `${id}, mode ${at + 1}`);
          [mode.share_x, mode.share_y, mode.share_twist, mode.captured_x, mode.captured_y, mode.captured_twist]
            .forEach((share, part) => assertShown(line[3 + part].text, 100 * share, `${id}, mode ${at + 1}, share ${part}`));
        });
        if (changes.length) {
          const lines = await cells(`#${id} table.changes tbody tr`);
          changes.forEach((change, at) => {
            const line = lines[at + 1];
            assert.equal(line[0].all, change.words);
            compare(line[1], change.added_concrete_m3, `${id}, change ${at + 1}`);
            if (change.after) assertShown(line[5].text, change.after.ratio_to_smaller, `${id}, change ${at + 1}: ratio`);
          });
        }
        const slopes = await cells(`#${id} table.sensitivities tbody tr`);
        assert.equal(slopes.length, of.sensitivities.length);
        slopes.forEach((line, at) => {
          const one = of.sensitivities[at];
          assert.equal(line[0].all, one.size);
          if (!one.per_m3) return;
          const meant = [one.per_m3.ratio_to_smaller, one.per_m3.period_x_s, one.per_m3.period_y_s, one.per_m3.period_twist_s, ...one.per_m3.storey_drift];
          const told = line.slice(2).map((cell) => Number(cell.value));
          assert.deepEqual([...told].sort((a, b) => a - b), meant.sort((a, b) => a - b));
          compared += told.length;
        });
        const walls = await page.$$eval(`#${id} .band .mark:has(polygon.wall) title`, (list) => list.map((one) => one.textContent));
        for (const text of walls) {
          const [, wall, group, size] = text.match(/^Wall (.+) of (.+?): ([\d.]+) mm/);
          assert(of.geometry.walls.some((one) => one.id === wall && one.group === group), text);
          const zones = of.geometry.wall_groups.find((one) => one.id === group).zones;
          assert(zones.some((zone) => zone.size_mm === Number(size) || zone.given_mm === Number(size)), text);
          compared += 1;
        }
      }
      assert(compared > 60, `only ${compared} numbers were compared`);
      if (json.bound?.added_concrete_m3 != null) {
        const value = await page.$eval("#bound", (one) => Number(one.dataset.value));
        assert.equal(value, json.bound.added_concrete_m3);
      }
      await close(page);
    });

    await test(`${name}: sorting by mouse and keyboard`, async () => {
      const page = await open(file);
      const columns = await page.locator("#designs thead th").count();
      const column = (at) => page.$$eval("#designs tbody tr", (rows, at) => rows.map((row) => row.cells[at].dataset.value), at);
      for (let at = 0; at < columns; at += 1) {
        const button = page.locator("#designs thead th button").nth(at);
        await button.click();
        const rising = (await column(at)).filter((value) => value !== "");
        const order = (a, b) => (isNaN(a) || isNaN(b) ? a.localeCompare(b) : a - b);
        assert.deepEqual(rising, [...rising].sort(order), `column ${at}`);
        await button.focus();
        await page.keyboard.press("Enter");
        const falling = (await column(at)).filter((value) => value !== "");
        assert.deepEqual(falling, [...falling].sort((a, b) => order(b, a)), `column ${at}, falling`);
        assert.equal(await page.locator("#designs thead th").nth(at).getAttribute("aria-sort"), "descending");
      }
      await close(page);
    });

    await test(`${name}: choosing by link, mouse, keyboard and touch`, async () => {
      const page = await open(file, { hasTouch: true });
      const shown = () => page.$$eval("article.tower", (list) => list.filter((one) => one.checkVisibility()).map((one) => one.id));
      assert.deepEqual(await shown(), [designs[1].id]);
      await page.locator(`label:has(input[value=given])`).click();
      assert.deepEqual(await shown(), ["given"]);
      await page.locator("input[name=tower][value=given]").focus();
      await page.keyboard.press("ArrowRight");
      assert.deepEqual(await shown(), [designs[1].id]);
      await page.locator(`label:has(input[value=given])`).tap();
      assert.deepEqual(await shown(), ["given"]);
      await page.locator(`#designs a[href="#${designs[1].id}"]`).click();
      assert.deepEqual(await shown(), [designs[1].id]);
      for (const measure of await page.$$eval("#measure option", (list) => list.map((one) => one.value))) {
        await page.selectOption("#measure", measure);
        const tornados = await page.$$eval(".shown figure:has(svg[id*=tornado])", (list) => list.filter((one) => one.checkVisibility()).map((one) => one.querySelector("svg").id));
        assert.deepEqual(tornados, [`${designs[1].id}-tornado-${measure}`]);
      }
      await close(page);
    });
  }
  console.log(`${count} browser tests passed`);
} finally {
  await browser.close();
  rmSync(desk, { recursive: true, force: true });
}
