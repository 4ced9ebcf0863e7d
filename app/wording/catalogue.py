"""Every sentence a grower reads, in each language side by side.

A sentence is a `Words`: leaving a language out does not type-check and does not run. One that
counts is a `Counted`: its form for one, and for any other number. `{names}` are filled in by
`Reader.say`; both languages must use the same ones (tests/wording/test_catalogue.py).
A new language is a field of `Words`, and what mypy then asks for.
"""

from typing import Literal, NamedTuple, get_args

Language = Literal["en", "es"]
LANGUAGES: tuple[Language, ...] = get_args(Language)


class Words(NamedTuple):
    """A sentence in every language."""

    en: str
    es: str


class Counted(NamedTuple):
    """A sentence that counts `{n}`: for one, and for any other number."""

    one: Words
    other: Words


LANGUAGE_NAMES = {"en": "English", "es": "español"}

COMMON: dict[str, Words | Counted] = {
    "caution_title": Words(
        "Estimates to support a decision.", "Estimaciones para apoyar una decisión."
    ),
    "caution": Words(
        "Local water rights, orders and delivery rules come first; a licensed or certified "
        "agronomist’s and the grower’s own judgement overrule these figures. Check the soil "
        "before a large application. Electrical, pumping and chemical-injection work follows "
        "local code and licensed practice.",
        "Los derechos de agua, las órdenes y las reglas de entrega locales van primero; el "
        "criterio de un agrónomo titulado o certificado y el del propio agricultor prevalecen "
        "sobre estas cifras. Revise el suelo antes de un riego grande. Los trabajos eléctricos, "
        "de bombeo y de inyección de químicos siguen las normas locales y la práctica autorizada.",
    ),
    "today": Words("today", "hoy"),
    "tomorrow": Words("tomorrow", "mañana"),
    "yesterday": Words("yesterday", "ayer"),
    "hours": Words("{n} h", "{n} h"),
    "mm": Words("{n} mm", "{n} mm"),
    "inches": Words("{n} in", "{n} pulg"),
    "m3": Words("{n} m³", "{n} m³"),
    "acre_feet": Words("{n} acre-feet", "{n} acre-pies"),
}

FIELDS: dict[str, Words | Counted] = {
    "fields": Counted(
        Words("{n} field", "{n} parcela"),
        Words("{n} fields", "{n} parcelas"),
    ),
    "water_of": Counted(
        Words("water {n} of {all}", "regar {n} de {all}"),
        Words("water {n} of {all}", "regar {n} de {all}"),
    ),
}

# net radiation's rungs, by number
RUNGS = (
    Words("none", "ninguna"),
    Words("four measured components", "cuatro componentes medidas"),
    Words("measured sunlight and sky", "luz solar y cielo medidos"),
    Words("a net radiation sensor", "un sensor de radiación neta"),
    Words("a model taught by measurements", "un modelo ajustado a mediciones"),
    Words("a model from measured sunlight", "un modelo con luz solar medida"),
    Words("a model from neighbours’ sunlight", "un modelo con luz solar de estaciones vecinas"),
    Words("a model from hours of sunshine", "un modelo con horas de sol"),
    Words("a model from temperatures", "un modelo con temperaturas"),
    Words("the usual for the date", "lo habitual para la fecha"),
)

LETTER: dict[str, Words | Counted] = {
    "subject": Words(
        "Week of {day}: {water}, {farm}",
        "Semana del {day}: {water}, {farm}",
    ),
    "subject_none": Words("no water needed", "no hace falta regar"),
    "subject_correction": Words(
        "Correction {n}, week of {day}: {water}, {farm}",
        "Corrección {n}, semana del {day}: {water}, {farm}",
    ),
    "week_of": Words("{farm}, week of {day}", "{farm}, semana del {day}"),
    "title_none": Words("No field needs water this week", "Ninguna parcela necesita agua"),
    "title_all": Words("Water all your fields this week", "Riegue todas sus parcelas esta semana"),
    "title_one": Words("Water {field} this week", "Riegue {field} esta semana"),
    "title": Words(
        "Water {n} of your {all} fields this week", "Riegue {n} de sus {all} parcelas esta semana"
    ),
    "correction": Words(
        "This is correction {n}: it takes the place of this week’s letter. The advice has changed "
        "for {fields}.",
        "Esta es la corrección {n}: reemplaza la carta de esta semana. El consejo cambió para "
        "{fields}.",
    ),
    "first": Words("First:", "Antes que nada:"),
    "doubt_stale": Words(
        "{fields}: unsure. {station} has sent no weather since {day}. Look at the soil before you "
        "decide.",
        "{fields}: sin certeza. {station} no ha enviado datos desde el {day}. Revise el suelo "
        "antes de decidir.",
    ),
    "doubt_silent": Words(
        "{fields}: unsure. {station} has sent no weather at all. Look at the soil before you "
        "decide.",
        "{fields}: sin certeza. {station} no ha enviado ningún dato. Revise el suelo antes de "
        "decidir.",
    ),
    "doubt_range": Words(
        "{fields}: unsure. The range is wide, {days} between early and late. Look at the soil "
        "before you decide.",
        "{fields}: sin certeza. El margen es amplio, {days} entre lo temprano y lo tardío. Revise "
        "el suelo antes de decidir.",
    ),
    "doubt_other": Words(
        "{fields}: unsure. Look at the soil before you decide.",
        "{fields}: sin certeza. Revise el suelo antes de decidir.",
    ),
    "doubt_morning": Words(
        "These figures are of {day}; nothing newer has been worked out.",
        "Estas cifras son del {day}; no se ha calculado nada más reciente.",
    ),
    "no_chance": Words(
        "{field} will pass its limit and cannot be watered this week: it must be kept off, or its "
        "system is not free.",
        "{field} pasará su límite y no puede regarse esta semana: no se debe regar, o su sistema "
        "no está libre.",
    ),
    "no_chance_in_time": Words(
        "{field} passes its limit before water can reach it.",
        "{field} pasa su límite antes de que el agua pueda llegar.",
    ),
    "falling_behind": Words(
        "{field}: the system cannot keep up with the crop’s use.",
        "{field}: el sistema no alcanza a reponer lo que consume el cultivo.",
    ),
    "day": Words("Day", "Día"),
    "field": Words("Field", "Parcela"),
    "run": Words("Run", "Tiempo"),
    "gross": Words("Apply (gross)", "Aplicar (bruto)"),
    "expected": Words(
        "* if the weather and the water before it go as expected",
        "* si el tiempo y el riego anterior resultan como se espera",
    ),
    "done": Words("Done", "Hecho"),
    "otherwise": Words("Did something else", "Hice otra cosa"),
    "decided": Words(
        "† set by your advisor, in place of the advice reckoned",
        "† fijado por su asesor, en lugar del consejo calculado",
    ),
    "withheld": Words(
        "Your advisor asks you not to water {field} through {day}.",
        "Su asesor le pide no regar {field} hasta el {day} inclusive.",
    ),
    "withheld_note": Words(
        "Your advisor asks you not to water {field} through {day}: {note}",
        "Su asesor le pide no regar {field} hasta el {day} inclusive: {note}",
    ),
    "rest": Counted(
        Words("{fields} needs no water this week.", "{fields} no necesita agua esta semana."),
        Words("{fields} need no water this week.", "{fields} no necesitan agua esta semana."),
    ),
    "from_advisor": Words("From your advisor.", "De su asesor."),
    "signed": Words("{name}", "{name}"),
    "signed_for": Words("{name}, for {advisor}", "{name}, en lugar de {advisor}"),
    "last_week": Words("Last week, {first} to {last}", "La semana pasada, del {first} al {last}"),
    "used": Words("Crop used", "Consumo del cultivo"),
    "rain": Words("Rain", "Lluvia"),
    "applied": Words("You applied", "Usted aplicó"),
    "whole_farm": Words("By area, all fields", "Según superficie, todas"),
    "applied_gross": Words(
        "Applied is gross, as it is entered. Fields without an entry may have been watered: answer "
        "with the links above.",
        "Lo aplicado es bruto, según lo anotado. Una parcela sin anotación puede haberse regado: "
        "responda con los enlaces de arriba.",
    ),
    "energy": Words(
        "How the energy the crops received was obtained: {ways}.",
        "Cómo se obtuvo la energía que recibieron los cultivos: {ways}.",
    ),
    "energy_way": Words("at {station}, {ways}", "en {station}, {ways}"),
    "energy_days": Counted(
        Words("{way} on {n} day", "{way} {n} día"),
        Words("{way} on {n} days", "{way} {n} días"),
    ),
    "energy_none": Words(
        "There was no record of the energy the crops received.",
        "No hubo registro de la energía que recibieron los cultivos.",
    ),
    "days": Counted(Words("{n} day", "{n} día"), Words("{n} days", "{n} días")),
    "chart": Words("How dry the soil is on {day}", "Qué tan seco está el suelo el {day}"),
    "chart_key": Words(
        "Bar: depletion. Tick: the limit. Light band: the range.",
        "Barra: agotamiento. Marca: el límite. Franja clara: el margen.",
    ),
    "chart_alt": Words(
        "How dry the soil is, as a share of the limit: {fields}.",
        "Qué tan seco está el suelo, como parte del límite: {fields}.",
    ),
    "chart_share": Words("{field} {share}", "{field} {share}"),
    "on_page": Words("Your farm’s page", "La página de su finca"),
    "change": Words("Language, units, day or pause", "Idioma, unidades, día o pausa"),
    "stop": Words("Stop these letters", "No recibir más estas cartas"),
    "calendar_name": Words("Watering, {farm}", "Riegos, {farm}"),
    "calendar_item": Words("Water {field}: {hours} ({depth})", "Regar {field}: {hours} ({depth})"),
}

PAGES: dict[str, Words | Counted] = {
    "rounds": Words("Rounds", "Ronda"),
    "letters": Words("Letters", "Cartas"),
    "intake": Words("Intake", "Entrada"),
    "farm": Words("Farm", "Finca"),
    "fields": Words("Fields", "Parcelas"),
    "stations": Words("Stations", "Estaciones"),
    "people": Words("People", "Personas"),
    "methods": Words("Methods", "Métodos"),
    "skip": Words("To the page’s own part", "Ir al contenido de la página"),
    "caution_label": Words("Caution", "Advertencia"),
    "pages_label": Words("Pages", "Páginas"),
    "this_week": Words("This week", "Esta semana"),
    "nothing": Words(
        "Nothing has been worked out for this farm yet.",
        "Todavía no se ha calculado nada para esta finca.",
    ),
    "water_now": Words(
        "Water {field} {day}: {hours}, {depth}.", "Riegue {field} {day}: {hours}, {depth}."
    ),
    "expected": Words("expected", "previsto"),
    "answered_done": Words("you said: done", "usted dijo: hecho"),
    "log": Words("What did you do?", "¿Qué hizo?"),
    "which_field": Words("Field", "Parcela"),
    "which_day": Words("Day", "Día"),
    "amount": Words("Amount", "Cantidad"),
    "unit": Words("Unit", "Unidad"),
    "in_hours": Words("hours", "horas"),
    "in_depth_mm": Words("mm gross", "mm brutos"),
    "in_depth_in": Words("inches gross", "pulgadas brutas"),
    "note": Words("Note (may be left empty)", "Nota (puede quedar vacía)"),
    "save": Words("Log it", "Anotar"),
    "saved": Words("Logged: {field}, {day}, {amount}.", "Anotado: {field}, {day}, {amount}."),
    "logged": Words("Logged in the last two weeks", "Anotado en las últimas dos semanas"),
    "logged_none": Words("Nothing is logged.", "No hay nada anotado."),
    "gauge_rain": Words("rain, own gauge", "lluvia, pluviómetro propio"),
    "past_letters": Words("Letters", "Cartas"),
    "past_none": Words("No letter has been sent yet.", "Todavía no se ha enviado ninguna carta."),
    "calendar": Words("Calendar", "Calendario"),
    "calendar_how": Words(
        "Subscribe to this address in your phone’s calendar; the days to water then follow the "
        "letters. Keep it to yourself: whoever has it can read the days.",
        "Suscríbase a esta dirección en el calendario de su teléfono; los días de riego siguen "
        "entonces a las cartas. No la comparta: quien la tenga puede leer los días.",
    ),
    "settings": Words("How letters reach you", "Cómo le llegan las cartas"),
    "language": Words("Language", "Idioma"),
    "units": Words("Units", "Unidades"),
    "metric": Words("millimetres, hectares", "milímetros, hectáreas"),
    "us": Words("inches, acres", "pulgadas, acres"),
    "weekday": Words("Day of the week", "Día de la semana"),
    "hour": Words("Hour", "Hora"),
    "paused": Words("Pause the letters", "Pausar las cartas"),
    "change": Words("Change", "Cambiar"),
    "changed": Words("Changed.", "Cambiado."),
    "depletion": Words(
        "{depletion} are missing from the root zone; the limit is {limit}.",
        "Faltan {depletion} en la zona de raíces; el límite es {limit}.",
    ),
    "no_water": Words("No water this week.", "Sin riego esta semana."),
    "unsure": Words("unsure", "sin certeza"),
    "figures_of": Words("Figures of {day}", "Cifras del {day}"),
    "see_field": Words("How this is computed", "Cómo se calcula"),
    "field_pages": Words(
        "Every figure can be opened on the field’s own page.",
        "Cada cifra puede abrirse en la página de la parcela (en inglés).",
    ),
}

ANSWERS: dict[str, Words | Counted] = {
    "done_title": Words("Was this done?", "¿Se hizo esto?"),
    "otherwise_title": Words("What did you do instead?", "¿Qué hizo en su lugar?"),
    "advised": Words(
        "Advised: {field}, {day}, {hours}, {depth}.",
        "Aconsejado: {field}, {day}, {hours}, {depth}.",
    ),
    "done_button": Words("Yes, it ran {hours}", "Sí, se regó {hours}"),
    "ran_on": Words("It ran on", "Se regó el"),
    "not_watered": Words("It was not watered", "No se regó"),
    "nothing_yet": Words(
        "Nothing is logged until you press a button.",
        "No se anota nada hasta que pulse un botón.",
    ),
    "thanks": Words("Thank you. It is in the book.", "Gracias. Quedó anotado."),
    "said_before": Words(
        "You answered this before; a new answer takes the place of the old one.",
        "Usted ya respondió; una respuesta nueva reemplaza la anterior.",
    ),
    "expired_title": Words("This link has run out", "Este enlace ha caducado"),
    "expired": Words(
        "Links in a letter work for three weeks. Log the water on your farm’s page, or tell your "
        "advisor.",
        "Los enlaces de una carta sirven tres semanas. Anote el riego en la página de su finca o "
        "avise a su asesor.",
    ),
    "broken_title": Words("This link is not whole", "Este enlace está incompleto"),
    "broken": Words(
        "Open it once more from the letter; some mail programs cut long links.",
        "Ábralo otra vez desde la carta; algunos programas cortan los enlaces largos.",
    ),
    "stop_title": Words("Stop these letters?", "¿Dejar de recibir estas cartas?"),
    "stop_text": Words(
        "Letters about {farm} go to {address}. After this none is sent.",
        "Las cartas sobre {farm} llegan a {address}. Después de esto no se envía ninguna.",
    ),
    "stop_button": Words("Stop the letters", "No recibir más cartas"),
    "start_button": Words("Send them again", "Volver a recibirlas"),
    "stopped": Words("No more letters go to {address}.", "No se enviarán más cartas a {address}."),
    "started": Words("Letters go to {address} again.", "Las cartas llegan de nuevo a {address}."),
    "wrong_number": Words(
        "{typed} is no number. Write it as 7.5.", "{typed} no es un número. Escríbalo como 7.5."
    ),
    "wrong_day": Words(
        "{typed} is no date of the last weeks. Choose a day up to today.",
        "{typed} no es una fecha de las últimas semanas. Elija un día hasta hoy.",
    ),
    "wrong_amount": Words(
        "{typed} is too much or too little for one day; nothing was logged.",
        "{typed} es demasiado o muy poco para un día; no se anotó nada.",
    ),
}

PEOPLE: dict[str, Words | Counted] = {
    "invite_subject": Words("Rillbook: choose your password", "Rillbook: elija su contraseña"),
    "invite": Words(
        "{who} has opened an account for you in Rillbook, where you see when and how much to "
        "water. Choose your password here, within {days} days; the link works once:",
        "{who} le abrió una cuenta en Rillbook, donde verá cuándo y cuánto regar. Elija aquí su "
        "contraseña, dentro de {days} días; el enlace sirve una sola vez:",
    ),
    "reset_subject": Words("Rillbook: a new password", "Rillbook: una contraseña nueva"),
    "reset": Words(
        "A new password was asked for at this address. Choose it here, within {days} day; the link "
        "works once. If it was not you, leave this letter; nothing changes:",
        "Se pidió una contraseña nueva para esta dirección. Elíjala aquí, dentro de {days} día; el "
        "enlace sirve una sola vez. Si no fue usted, no haga nada; nada cambia:",
    ),
}

TABLES: dict[str, dict[str, Words | Counted]] = {
    "common": COMMON,
    "fields": FIELDS,
    "letter": LETTER,
    "people": PEOPLE,
    "pages": PAGES,
    "answers": ANSWERS,
    "rungs": {str(number): words for number, words in enumerate(RUNGS)},
}
