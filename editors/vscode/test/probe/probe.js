// Walks through the features by the editor's own interface and writes what it saw.
const fs = require("fs");
const path = require("path");
const vscode = require("vscode");

exports.activate = async () => {
  const seen = {};
  try {
    await walk(seen);
  } catch (error) {
    seen.error = String(error && error.stack ? error.stack : error);
  }
  fs.writeFileSync(process.env.CRENATE_PROBE, JSON.stringify(seen));
};

async function until(what, condition) {
  for (let attempt = 0; attempt < 2400; attempt++) {
    const value = await condition();
    if (value) {
      return value;
    }
    await new Promise((resolve) => setTimeout(resolve, 50));
  }
  throw new Error(`waited in vain for ${what}`);
}

/// Tells the page that it may look, and waits until it has looked.
async function look(step) {
  fs.writeFileSync(`${process.env.CRENATE_PROBE}.step`, step);
  await until(`the page after "${step}"`, () => fs.existsSync(`${process.env.CRENATE_PROBE}.${step}`));
}

async function walk(seen) {
  const folder = vscode.workspace.workspaceFolders[0].uri;
  const document = await vscode.workspace.openTextDocument(vscode.Uri.file(path.join(folder.fsPath, "sample.cren")));
  await vscode.window.showTextDocument(document);
  const uri = document.uri;
  seen.language = document.languageId;
  const place = (needle, ahead = 0) => document.positionAt(document.getText().indexOf(needle) + ahead);
  const findings = () => vscode.languages.getDiagnostics(uri);
  const code = (finding) => (typeof finding.code === "object" ? finding.code.value : finding.code);
  const all = new vscode.Range(0, 0, 99, 0);

  const found = await until("the finding", () => findings().find((finding) => code(finding) === "unknown-name"));
  seen.finding = { start: [found.range.start.line, found.range.start.character], message: found.message, link: String(found.code.target || "") };
  seen.findings = findings().map(code);
  await vscode.commands.executeCommand("workbench.actions.view.problems");
  await look("found");
  await vscode.commands.executeCommand("workbench.action.closePanel");

  const fixes = await vscode.commands.executeCommand("vscode.executeCodeActionProvider", uri, found.range, "quickfix");
  seen.fixes = fixes.map((fix) => fix.title);
  await vscode.workspace.applyEdit(fixes.find((fix) => fix.title.includes("wall")).edit);
  await until("the finding to go", () => findings().length === 0);

  // A hover that comes before the bands are known has no gap: it is asked for again.
  const hover = () => until("a hover with a gap", async () => {
    const hovers = await vscode.commands.executeCommand("vscode.executeHoverProvider", uri, place("crystal tern", 9));
    return hovers.flatMap((hover) => hover.contents.map((content) => content.value || String(content))).join("\n").match(/^.*gap 1.*$/ms)?.[0];
  });
  seen.before = await hover();
  const edit = new vscode.WorkspaceEdit();
  edit.replace(uri, new vscode.Range(place("5.4 nm"), place("5.4 nm", 3)), "8.4");
  await vscode.workspace.applyEdit(edit);
  seen.after = await hover();

  const label = (hint) => (typeof hint.label === "string" ? hint.label : hint.label.map((part) => part.value).join(""));
  seen.hints = await until("the hint behind the heading", async () => {
    const hints = await vscode.commands.executeCommand("vscode.executeInlayHintProvider", uri, all);
    const told = hints.map((hint) => [hint.position.line, label(hint)]);
    return told.some(([line]) => line === 8) && told;
  });
  const symbols = await vscode.commands.executeCommand("vscode.executeDocumentSymbolProvider", uri);
  seen.symbols = symbols.map((symbol) => symbol.name);
  const completion = await vscode.commands.executeCommand("vscode.executeCompletionItemProvider", uri, place("of wall", 3));
  seen.completion = completion.items.map((item) => (typeof item.label === "string" ? item.label : item.label.label));
  const definition = await vscode.commands.executeCommand("vscode.executeDefinitionProvider", uri, place("of wall", 4));
  seen.definition = definition.map((target) => (target.targetSelectionRange || target.range).start.line);
  const rename = await vscode.commands.executeCommand("vscode.executeDocumentRenameProvider", uri, place("of wall", 4), "fence");
  seen.renamed = rename.entries().flatMap(([, edits]) => edits).length;
  const layout = await vscode.commands.executeCommand("vscode.executeFormatDocumentProvider", uri, { tabSize: 2, insertSpaces: true });
  const format = new vscode.WorkspaceEdit();
  format.set(uri, layout);
  await vscode.workspace.applyEdit(format);
  seen.text = document.getText();

  // The panel beside the text.
  const editor = vscode.window.activeTextEditor;
  const cursor = place("crystal tern", 9);
  editor.selection = new vscode.Selection(cursor, cursor);
  await vscode.commands.executeCommand("crenate.showPicture");
  await look("opened");
  await editor.edit((builder) => builder.insert(place("layer", 0), "bands 6\n  "));
  await look("more");
  await editor.edit((builder) => builder.replace(new vscode.Range(place("8.4 nm"), place("8.4 nm", 3)), "5.4"));
  await look("typed");
  await editor.edit((builder) => builder.replace(new vscode.Range(place("bands 6"), place("bands 6", 7)), "bands 6 nm"));
  await look("broken");
}
