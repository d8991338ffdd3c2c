;;; test.el --- Drives eglot against the server  -*- lexical-binding: t -*-

;; -Q leaves out Debian's packages.
(dolist (folder (file-expand-wildcards "/usr/share/emacs/site-lisp/elpa*/*"))
  (when (file-directory-p folder) (add-to-list 'load-path folder)))
(require 'eglot)
(load (expand-file-name "../crenate-mode.el" (file-name-directory load-file-name)) nil t)

(setq project-find-functions nil
      eglot-sync-connect 10
      eglot-autoshutdown t
      make-backup-files nil)

(defun test-fail (format &rest arguments)
  (message "FAILED: %s" (apply #'format format arguments))
  (message "%s" (buffer-string))
  (kill-emacs 1))

(defun test-wait (what condition)
  "Wait until CONDITION holds; idle timers do not run in batch."
  (let ((end (+ (float-time) 30)) done)
    (while (and (not (setq done (funcall condition))) (< (float-time) end))
      (accept-process-output nil 0.02))
    (unless done (test-fail "waited in vain for %s" what))
    (message "  %s" what)
    done))

(defun test-send ()
  "Tell the server of edits."
  (eglot--signal-textDocument/didChange))

(defun test-findings ()
  (flymake-start)
  (mapcar #'flymake-diagnostic-text (flymake-diagnostics)))

(defun test-found (text)
  (seq-some (lambda (found) (string-match-p (regexp-quote text) found)) (test-findings)))

(defun test-gap ()
  "The size of the lowest gap in meV, as the hover tells it."
  (goto-char (point-min))
  (search-forward "crystal te")
  (let* ((reply (jsonrpc-request (eglot--current-server-or-lose) :textDocument/hover
                                 (eglot--TextDocumentPositionParams)))
         (contents (plist-get reply :contents))
         (text (plist-get contents :value)))
    (unless (and text (string-match "\\([0-9.]+\\)[ \u00a0]*meV" text))
      (test-fail "the hover says %S" reply))
    (string-to-number (match-string 1 text))))

(defun test-near (what value expected)
  (unless (< (abs (- value expected)) 0.06)
    (test-fail "%s is %s and should be %s" what value expected))
  (message "  %s: %s meV" what value))

(find-file "sample.cren")
(unless (eq major-mode 'crenate-mode) (test-fail "the mode is %s" major-mode))
(apply #'eglot (eglot--guess-contact))
(test-wait "the server" #'eglot-current-server)
(flymake-mode 1)

(test-wait "the finding" (lambda () (test-found "wal")))
(let* ((diagnostic (seq-find (lambda (found) (string-match-p "wal" (flymake-diagnostic-text found)))
                             (flymake-diagnostics)))
       (place (cons (line-number-at-pos (flymake-diagnostic-beg diagnostic))
                    (buffer-substring (flymake-diagnostic-beg diagnostic) (flymake-diagnostic-end diagnostic)))))
  (unless (equal place '(11 . "wal")) (test-fail "it is found at %S" place)))
(goto-char (point-min))
(search-forward "of wal")
(let* ((actions (eglot-code-actions (1- (point)) (point) "quickfix"))
       (fix (seq-find (lambda (action) (string-match-p "wall" (plist-get action :title))) actions)))
  (unless fix (test-fail "the actions are %S" actions))
  (eglot--apply-workspace-edit (plist-get fix :edit)))
(test-wait "the fix" (lambda () (save-excursion (goto-char (point-min)) (search-forward "of wall" nil t))))
(test-send)
(test-wait "the finding to go" (lambda () (null (test-findings))))

;; The values are those of neovim/test/expected.py: the closed form of two layers a cell.
(test-near "the gap" (test-gap) 127.3371)
(goto-char (point-min))
(search-forward "5.4 nm")
(replace-match "8.4 nm")
(test-send)
(test-near "the gap after the edit" (test-gap) 82.8358)

(eglot-format-buffer)
(test-wait "the standard layout"
           (lambda () (save-excursion (goto-char (point-min)) (search-forward "  layer     8.4 nm of basin" nil t))))
(set-buffer-modified-p nil)
(let ((server (eglot-current-server)))
  (eglot-shutdown server nil 5)
  (test-wait "the server to end" (lambda () (not (jsonrpc-running-p server)))))
(kill-emacs 0)
;;; test.el ends here
