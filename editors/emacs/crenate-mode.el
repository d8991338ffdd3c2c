;;; crenate-mode.el --- Periodic potentials in plain text  -*- lexical-binding: t -*-

;; Version: 0.1
;; Package-Requires: ((emacs "28.1"))
;; Keywords: languages

;;; Commentary:

;; Colours for *.cren files, and the language server through eglot: with
;; `crenate' on the path, M-x eglot in such a buffer is all.

;;; Code:

(defvar crenate-mode-syntax-table
  (let ((table (make-syntax-table)))
    (modify-syntax-entry ?# "<" table)
    (modify-syntax-entry ?\n ">" table)
    (modify-syntax-entry ?\r ">" table)
    (modify-syntax-entry ?\" "\"" table)
    (modify-syntax-entry ?\\ "." table)
    (modify-syntax-entry ?_ "_" table)
    table)
  "A comment runs from # to the line's end; strings have no escapes.")

(defconst crenate-font-lock-keywords
  (let ((statements '("use" "let" "waive" "mass" "edge" "monolayer" "nonparabolic" "rate" "source" "title"
                      "degeneracy" "carriers" "filling" "temperature" "recoil" "bands" "lattice" "layer" "stack"
                      "delta" "profile" "table" "cosine" "depth" "fourier" "site" "atom" "formfactor" "measure"
                      "require"))
        (clauses '("of" "at" "to" "by" "and" "in" "within" "between" "phase" "sigma" "size" "radius" "angle"
                   "angles" "axis" "like" "because" "times" "star" "curve"))
        (choices '("fermions" "bosons" "line" "spline" "direct" "indirect" "closed" "metal" "semimetal"
                   "semiconductor" "insulator")))
    `(("^[ \t]*\\(material\\|crystal\\)[ \t]+\\(\\w+\\)"
       (1 font-lock-keyword-face) (2 font-lock-type-face))
      (,(concat "^[ \t]*" (regexp-opt statements t) "\\_>") 1 font-lock-keyword-face)
      ("^[ \t]*\\(?:let\\|measure\\)[ \t]+\\(\\w+\\)" 1 font-lock-variable-name-face)
      (,(regexp-opt clauses 'symbols) . font-lock-keyword-face)
      (,(regexp-opt choices 'symbols) . font-lock-constant-face)
      ("\\_<\\(gap\\|width\\|bottom\\|top\\|level\\|hopping\\|fermi\\)\\_>" . font-lock-function-name-face)))
  "What stands out in a crenate file.")

;;;###autoload
(define-derived-mode crenate-mode prog-mode "crenate"
  "Major mode for periodic potentials in plain text."
  (setq-local comment-start "# ")
  (setq-local comment-start-skip "#+[ \t]*")
  (setq-local indent-tabs-mode nil)
  (setq-local font-lock-defaults '(crenate-font-lock-keywords)))

;;;###autoload
(add-to-list 'auto-mode-alist '("\\.cren\\'" . crenate-mode))

(defvar eglot-server-programs)
(with-eval-after-load 'eglot
  (add-to-list 'eglot-server-programs '(crenate-mode . ("crenate" "serve"))))

(provide 'crenate-mode)
;;; crenate-mode.el ends here
