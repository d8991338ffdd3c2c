// The picture of the crystal under the cursor, in a panel beside the text; it follows the cursor and the typing.

import * as vscode from "vscode";

/// What the server answers to `crenate/picture`.
export interface Picture {
  crystal: string;
  svg: string;
}

/// Asks the server for the picture at a position; null where there is no crystal.
export type Ask = (document: vscode.TextDocument, position: vscode.Position) => Promise<Picture | null>;

/// How long the cursor and the keys rest before a picture is asked for, in milliseconds.
const REST = 150;

export class PicturePanel implements vscode.Disposable {
  private panel: vscode.WebviewPanel | undefined;
  private timer: NodeJS.Timeout | undefined;
  private asked = 0;
  private shown: { uri: string; crystal: string } | undefined;
  private last: object | undefined;
  private readonly watching: vscode.Disposable[];

  constructor(private readonly ask: Ask) {
    this.watching = [
      vscode.window.onDidChangeTextEditorSelection((change) => this.soon(change.textEditor)),
      vscode.window.onDidChangeActiveTextEditor((editor) => this.soon(editor)),
      vscode.workspace.onDidChangeTextDocument((change) =>
        this.soon(vscode.window.visibleTextEditors.find((editor) => editor.document === change.document)),
      ),
    ];
  }

  dispose(): void {
    clearTimeout(this.timer);
    this.watching.forEach((watch) => watch.dispose());
    this.panel?.dispose();
  }

  /// Opens the panel, with the crystal of this name or the one under the cursor.
  async show(crystal?: string): Promise<void> {
    const editor = vscode.window.activeTextEditor;
    this.panel ??= this.open();
    this.panel.reveal(undefined, true);
    if (editor?.document.languageId === "crenate") {
      const start = crystal === undefined ? undefined : heading(editor.document, crystal);
      await this.refresh(editor.document, start ?? editor.selection.active);
    }
  }

  private open(): vscode.WebviewPanel {
    const place = { viewColumn: vscode.ViewColumn.Beside, preserveFocus: true };
    const panel = vscode.window.createWebviewPanel("crenate.picture", "Picture", place, { enableScripts: true, localResourceRoots: [] });
    panel.webview.onDidReceiveMessage(() => this.post(this.last));
    panel.onDidDispose(() => (this.panel = undefined));
    panel.webview.html = page();
    return panel;
  }

  private soon(editor: vscode.TextEditor | undefined): void {
    if (this.panel === undefined || editor?.document.languageId !== "crenate") {
      return;
    }
    clearTimeout(this.timer);
    this.timer = setTimeout(() => void this.refresh(editor.document, editor.selection.active), REST);
  }

  private async refresh(document: vscode.TextDocument, position: vscode.Position): Promise<void> {
    const turn = ++this.asked;
    const uri = document.uri.toString();
    let message: object | undefined;
    try {
      let picture = await this.ask(document, position);
      if (picture === null && this.shown?.uri === uri) {
        // The cursor is in a material or above: the crystal shown before may have changed with it.
        const start = heading(document, this.shown.crystal);
        picture = start === undefined ? null : await this.ask(document, start);
      }
      if (picture !== null) {
        this.shown = { uri, crystal: picture.crystal };
        message = picture;
      }
    } catch (error) {
      message = { trouble: error instanceof Error ? error.message : String(error) };
    }
    if (turn === this.asked && message !== undefined) {
      this.post(message);
    }
  }

  private post(message: object | undefined): void {
    this.last = message;
    if (this.panel !== undefined && message !== undefined) {
      if ("crystal" in message) {
        this.panel.title = `Picture of ${String(message.crystal)}`;
      }
      void this.panel.webview.postMessage(message);
    }
  }
}

/// Where the crystal's name stands in its heading.
function heading(document: vscode.TextDocument, crystal: string): vscode.Position | undefined {
  for (let line = 0; line < document.lineCount; line++) {
    const [, before, name] = /^(\s*crystal\s+)(\S+)/.exec(document.lineAt(line).text) ?? [];
    if (name?.normalize("NFC") === crystal) {
      return new vscode.Position(line, before.length);
    }
  }
  return undefined;
}

/// The panel's page. A picture that no longer holds is dimmed and says why.
function page(): string {
  const nonce = Array.from({ length: 4 }, () => Math.random().toString(36).slice(2)).join("");
  return `<!DOCTYPE html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta http-equiv="Content-Security-Policy" content="default-src 'none'; style-src 'unsafe-inline'; script-src 'nonce-${nonce}'">
<style>
  #picture svg { display: block; width: 100%; height: auto; max-height: 95vh; border-radius: 4px; }
  #picture.stale { opacity: 0.3; }
  #trouble { margin: 1em 0; }
</style>
</head>
<body>
<div id="trouble" role="status"></div>
<div id="picture"></div>
<script nonce="${nonce}">
  const picture = document.getElementById("picture");
  const trouble = document.getElementById("trouble");
  window.addEventListener("message", ({ data }) => {
    if (data.svg !== undefined) {
      picture.innerHTML = data.svg;
    }
    trouble.textContent = data.trouble ?? "";
    picture.classList.toggle("stale", data.svg === undefined);
  });
  acquireVsCodeApi().postMessage("ready");
</script>
</body>
</html>`;
}
