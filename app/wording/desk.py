"""Words of the Letters desk."""

LETTER_STATES = {
    "draft": "draft",
    "held": "held",
    "released": "released",
    "claimed": "sending",
    "sending": "sending",
    "sent": "sent",
    "refused": "refused",
    "unsure": "unsure",
}
STATE_WORDS = {
    "draft": "waits for your release",
    "held": "held back",
    "released": "leaves when it is due",
    "claimed": "is being handed to the mail server",
    "sending": "is being handed to the mail server",
    "sent": "handed to the mail server",
    "refused": "was not taken; look at the server’s words",
    "unsure": "the connection broke before the server answered: ask whether it arrived",
}
HELD_WHY = {
    "no_advice": "no advice has been worked out to write from",
    "too_late": "its week is half over",
    "stopped": "the recipient asked for no more letters, or paused them",
}
DEEDS_DONE = {
    "note": "The note is in.",
    "hold": "Held.",
    "release": "Released.",
    "send": "Released, and leaves with the next round, within a minute.",
    "back": "Taken back; it is a draft again.",
    "again": "It leaves again with the next round, within a minute.",
    "arrived": "Marked as sent.",
}
NO_SERVER = (
    "No mail server is set (RILLBOOK_SMTP_HOST): letters are written as .eml files to {folder}."
)
