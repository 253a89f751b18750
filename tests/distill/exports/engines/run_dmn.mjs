// Runs decision tables in situations: dmn-moddle reads the files, feelin reads the cells.
// Standard input: [{"xml": text, "situations": [{input: value, ...}, ...]}, ...].
// Standard output: for each table a list with, per situation, the results of the first row that
// holds, by the name of the output, or null where none does. Anything odd ends the run.

import { DmnModdle } from 'dmn-moddle';
import { evaluate, unaryTest } from 'feelin';

const sound = (expression, found) => {
  if (found.warnings.length) throw new Error(`${expression}: ${JSON.stringify(found.warnings)}`);
  return found.value;
};

// A cell looks at nothing but the value of its column, so it is asked once for each.
const known = new Map();
const holds = (cell, value) => {
  const key = `${typeof value}:${value}:${cell}`;
  if (!known.has(key)) known.set(key, sound(cell, unaryTest(cell, { '?': value })) === true);
  return known.get(key);
};

const run = async ({ xml, situations }) => {
  const { rootElement, warnings } = await new DmnModdle().fromXML(xml);
  if (warnings.length) throw new Error(JSON.stringify(warnings.map((one) => one.message)));
  const decisions = rootElement.drgElement.filter((one) => one.$type === 'dmn:Decision');
  if (decisions.length !== 1) throw new Error(`${decisions.length} decisions`);
  const table = decisions[0].decisionLogic;
  if (table.hitPolicy !== 'FIRST') throw new Error(`hit policy ${table.hitPolicy}`);
  const results = table.rule.map((row) =>
    row.outputEntry.map((entry) => sound(entry.text, evaluate(entry.text, {}))),
  );
  return situations.map((situation) => {
    const read = new Map();
    const values = table.input.map((clause) => {
      const expression = clause.inputExpression.text;
      if (!read.has(expression)) {
        read.set(expression, sound(expression, evaluate(expression, situation)));
      }
      return read.get(expression);
    });
    const hit = table.rule.findIndex((row) =>
      row.inputEntry.every((cell, place) => holds(cell.text, values[place])),
    );
    if (hit < 0) return null;
    return Object.fromEntries(table.output.map((one, place) => [one.name, results[hit][place]]));
  });
};

let text = '';
for await (const part of process.stdin) text += part;
const answers = [];
for (const job of JSON.parse(text)) answers.push(await run(job));
process.stdout.write(JSON.stringify(answers));
