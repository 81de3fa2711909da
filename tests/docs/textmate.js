/* textmate.js SOURCE_DIR: the TextMate grammar with the reader that editors use (npm packages
 * vscode-textmate and vscode-oniguruma, found by NODE_PATH): what scope the words of a cell get. Ends
 * with 77 (skipped) where these are missing. */
"use strict";
const fs = require("fs");
const path = require("path");

let textmate, oniguruma;
try {
    textmate = require("vscode-textmate");
    oniguruma = require("vscode-oniguruma");
} catch (error) {
    console.log("skipped: npm packages vscode-textmate and vscode-oniguruma are not in NODE_PATH");
    process.exit(77);
}

/* The groups of coloured.groups as scopes. */
const scopes = {
    Comment: "comment.line", Text: "string.quoted", Statement: "keyword.control", Part: "storage.type",
    Number: "constant.numeric", Arrow: "keyword.operator", Key: "variable.parameter",
    Quantity: "variable.other", Phrase: "keyword.other", Function: "support.function",
    Constant: "constant.language", None: "source.ampstead",
};

function group_of(tokens, column) {
    const token = tokens.find((t) => t.startIndex <= column && column < t.endIndex);
    const scope = token.scopes[token.scopes.length - 1];
    return Object.keys(scopes).find((name) => scope.startsWith(scopes[name])) || scope;
}

async function main(source) {
    const wasm = fs.readFileSync(path.join(path.dirname(require.resolve("vscode-oniguruma")), "onig.wasm"));
    await oniguruma.loadWASM(wasm.buffer.slice(wasm.byteOffset, wasm.byteOffset + wasm.byteLength));
    const file = path.join(source, "docs/editors/ampstead.tmLanguage.json");
    const registry = new textmate.Registry({
        onigLib: Promise.resolve({
            createOnigScanner: (patterns) => new oniguruma.OnigScanner(patterns),
            createOnigString: (text) => new oniguruma.OnigString(text),
        }),
        loadGrammar: async () => textmate.parseRawGrammar(fs.readFileSync(file, "utf8"), file),
    });
    const grammar = await registry.loadGrammar("source.ampstead");
    let stack = textmate.INITIAL;
    const lines = fs.readFileSync(path.join(source, "tests/docs/coloured.cell"), "utf8").split("\n").map((text) => {
        const read = grammar.tokenizeLine(text, stack);
        stack = read.ruleStack;
        return { text, tokens: read.tokens };
    });
    let failures = 0, count = 0;
    for (const row of fs.readFileSync(path.join(source, "tests/docs/coloured.groups"), "utf8").split("\n")) {
        const parts = /^(\d+) (.*) (\w+)$/.exec(row);
        if (!parts || row.startsWith("%")) {
            continue;
        }
        const { text, tokens } = lines[Number(parts[1]) - 1];
        const word = parts[2].replace(/[.*+?^${}()|[\]\\]/g, "\\$&");
        const at = text.search(/^\w/.test(parts[2]) ? new RegExp("(?<!\\w)" + word) : new RegExp(word));
        const groups = new Set();
        for (let k = at; k < at + parts[2].length; k++) {
            groups.add(group_of(tokens, k));
        }
        count++;
        if (at < 0 || groups.size !== 1 || !groups.has(parts[3])) {
            console.log("FAILED: line " + parts[1] + ", '" + parts[2] + "': " + [...groups].join("+") +
                " instead of " + parts[3]);
            failures++;
        }
    }
    console.log(failures ? failures + " failures" : "the grammar colours " + count + " words as it should");
    process.exit(failures ? 1 : 0);
}

main(process.argv[2]);
