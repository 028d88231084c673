"""Every command of the window with its key: one table, from which menu, shortcuts and the sheet of keys are made."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Command:
    """``name`` of the method that carries it out, what it is called, its keys (the first is shown), its group."""

    name: str
    words: str
    keys: tuple[str, ...]
    group: str
    given: tuple[object, ...] = ()


COMMANDS = (
    Command("open_file", "Open …", ("Ctrl+O",), "File"),
    Command("save_names", "Save names into the dossier", ("Ctrl+S",), "File"),
    Command("export", "Export a loop …", ("Ctrl+E",), "File", ("gif",)),
    Command("export", "Export a still …", ("Ctrl+Shift+E",), "File", ("png",)),
    Command("export", "Export the tables …", ("Ctrl+T",), "File", ("tables",)),
    Command("copy_words", "Copy what is said as text", ("Ctrl+C",), "File"),
    Command("close_window", "Close", ("Ctrl+W", "Ctrl+Q"), "File"),
    Command("undo", "Undo", ("Ctrl+Z",), "Edit"),
    Command("redo", "Redo", ("Ctrl+Shift+Z", "Ctrl+Y"), "Edit"),
    Command("rename", "Rename the mode", ("F2",), "Edit"),
    Command("step_mode", "Next mode", ("Right",), "Modes", (1,)),
    Command("step_mode", "Previous mode", ("Left",), "Modes", (-1,)),
    Command("step_mode", "First mode", ("Home",), "Modes", (-(10**6),)),
    Command("step_mode", "Last mode", ("End",), "Modes", (10**6,)),
    Command("filter_modes", "Filter the gallery …", ("Ctrl+F",), "Modes"),
    Command("next_design", "Next design", ("PgDown",), "Modes", (1,)),
    Command("next_design", "Previous design", ("PgUp",), "Modes", (-1,)),
    Command("toggle_play", "Play or pause", ("Space",), "Motion"),
    Command("step_phase", "A step forward", (".",), "Motion", (1,)),
    Command("step_phase", "A step back", (",",), "Motion", (-1,)),
    Command("true_scale", "True scale, ×1", ("T",), "Motion"),
    Command("drawn_scale", "As drawn by itself", ("D",), "Motion"),
    Command("nudge", "Larger motion", ("+", "="), "Motion", (1.25,)),
    Command("nudge", "Smaller motion", ("-",), "Motion", (0.8,)),
    Command("switch", "Energy colours", ("E",), "Look", ("energy",)),
    Command("switch", "Ghost: the undeformed outline", ("G",), "Look", ("ghost",)),
    Command("switch", "Hinges and flaps", ("H",), "Look", ("hinges",)),
    Command("switch", "Mesh edges", ("M",), "Look", ("mesh_edges",)),
    Command("switch", "Node lines", ("N",), "Look", ("node_lines",)),
    Command("toggle_theme", "Light or dark", ("L",), "Look"),
    Command("light", "What it does", ("1",), "Sentences", ("does",)),
    Command("light", "Where it folds (again: the next hinge)", ("2",), "Sentences", ("folds",)),
    Command("light", "How big it really is", ("3",), "Sentences", ("size",)),
    Command("light", "Whether it matters", ("4",), "Sentences", ("matters",)),
    Command("light", "Whether the model is right", ("5",), "Sentences", ("model",)),
    Command("light", "What the redesign did", ("6",), "Sentences", ("redesign",)),
    Command("light", "Where to stiffen or lighten next", ("7",), "Sentences", ("change",)),
    Command("dismiss", "Back: close the notice, light nothing", ("Esc",), "Sentences"),
    Command("next_layout", "Compare: one, side by side, overlay, difference", ("C",), "Compare"),
    Command("next_test_layout", "Hammer test: on top, beside, alone", ("X",), "Compare"),
    Command("next_beside", "The next design or test to compare with", ("V",), "Compare"),
    Command("turn_page", "Pairing picture", ("P",), "Compare", ("pairing",)),
    Command("turn_page", "Ladder of frequencies", ("B",), "Compare", ("ladder",)),
    Command("turn_page", "Lineages", ("K",), "Compare", ("lineage",)),
    Command("turn_page", "Pairing picture of the test", ("Shift+P",), "Compare", ("test pairing",)),
    Command("turn_page", "Ladder of the test", ("Shift+B",), "Compare", ("test ladder",)),
    Command("take_up", "Put right what is wrong in the test, or take it back", ("Ctrl+R",), "Compare", ("model",)),
    Command("look_from", "Usual view", ("U",), "Eye", ("usual",)),
    Command("look_from", "From the front", ("F5",), "Eye", ("front",)),
    Command("look_from", "From the back", ("F6",), "Eye", ("back",)),
    Command("look_from", "From the left", ("F7",), "Eye", ("left",)),
    Command("look_from", "From the right", ("F8",), "Eye", ("right",)),
    Command("look_from", "From the top", ("F9",), "Eye", ("top",)),
    Command("look_from", "From below", ("Shift+F9",), "Eye", ("below",)),
    Command("fit", "See everything", ("F",), "Eye"),
    Command("turn_eye", "Turn left", ("Ctrl+Left",), "Eye", (-1, 0)),
    Command("turn_eye", "Turn right", ("Ctrl+Right",), "Eye", (1, 0)),
    Command("turn_eye", "Turn up", ("Ctrl+Up",), "Eye", (0, 1)),
    Command("turn_eye", "Turn down", ("Ctrl+Down",), "Eye", (0, -1)),
    Command("zoom", "Nearer", ("Ctrl++", "Ctrl+="), "Eye", (1.25,)),
    Command("zoom", "Farther", ("Ctrl+-",), "Eye", (0.8,)),
    Command("pick_next", "Pick the next named point, then the largest motion", ("O",), "Eye"),
    Command("show_menu", "All commands", ("F10",), "Help"),
    Command("show_keys", "All keys", ("?", "F1"), "Help"),
)
