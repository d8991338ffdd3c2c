// Starts `crenate serve` and lets it do the rest.

import * as vscode from "vscode";
import { Picture, PicturePanel } from "./picture";
import { LanguageClient, ServerOptions, LanguageClientOptions, TransportKind } from "vscode-languageclient/node";

let client: LanguageClient | undefined;
let panel: PicturePanel | undefined;

export async function activate(context: vscode.ExtensionContext): Promise<void> {
  panel = new PicturePanel(picture);
  context.subscriptions.push(
    panel,
    vscode.commands.registerCommand("crenate.showPicture", () => panel?.show()),
    vscode.commands.registerCommand("crenate.restart", restart),
    vscode.workspace.onDidChangeConfiguration(async (change) => {
      if (change.affectsConfiguration("crenate.path")) {
        await restart();
      }
    }),
  );
  await start();
}

export async function deactivate(): Promise<void> {
  await client?.dispose();
  client = undefined;
}

async function picture(document: vscode.TextDocument, position: vscode.Position): Promise<Picture | null> {
  if (client === undefined) {
    throw new Error("crenate is not running");
  }
  const params = client.code2ProtocolConverter.asTextDocumentPositionParams(document, position);
  return client.sendRequest<Picture | null>("crenate/picture", params);
}

async function restart(): Promise<void> {
  await deactivate();
  await start();
}

async function start(): Promise<void> {
  const command = vscode.workspace.getConfiguration("crenate").get("path", "crenate");
  const server: ServerOptions = { command, args: ["serve"], transport: TransportKind.stdio };
  const options: LanguageClientOptions = {
    documentSelector: [{ language: "crenate" }],
    middleware: {
      // The lens `draw` opens the panel; all other commands are the server's.
      executeCommand: (name, args, next) =>
        name === "crenate.draw" ? panel?.show((args[0] as { crystal: string }).crystal) : next(name, args),
    },
  };
  client = new LanguageClient("crenate", "crenate", server, options);
  try {
    await client.start();
  } catch (error) {
    const message = `crenate could not be started (${String(error)}). Put it on the PATH, or name it in the settings.`;
    const settings = "Open the settings";
    if ((await vscode.window.showErrorMessage(message, settings)) === settings) {
      await vscode.commands.executeCommand("workbench.action.openSettings", "crenate.path");
    }
  }
}
