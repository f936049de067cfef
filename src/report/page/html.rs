//! A page as one file that needs nothing else: styles and script within, and a policy that lets no request out.

use base64::Engine;
use base64::engine::general_purpose::STANDARD;
use maud::{DOCTYPE, Markup, PreEscaped, html};
use sha2::{Digest, Sha256};

use crate::place::escape;
use crate::report::Tool;
use crate::report::page::chart::figure_set;
use crate::report::page::{Block, Cell, Page, Section, Table};
use crate::report::text::figure;

const STYLE: &str = include_str!("page.css");
const SCRIPT: &str = include_str!("page.js");

/// The page as HTML: the same bytes for the same content. Text from files is escaped.
pub fn html(page: &Page) -> String {
    let digest = STANDARD.encode(Sha256::digest(SCRIPT.as_bytes()));
    // Styles stand in attributes too (places of labels), so they are allowed inline; the script by its digest alone.
    let policy = format!(
        "default-src 'none'; style-src 'unsafe-inline'; script-src 'sha256-{digest}'; base-uri 'none'; form-action 'none'"
    );
    let mut sets = 0;
    let sections: Vec<Markup> =
        page.sections.iter().enumerate().map(|(index, part)| section(part, index, &mut sets)).collect();
    html! {
        (DOCTYPE)
        html lang="en" {
            head {
                meta charset="utf-8";
                meta http-equiv="Content-Security-Policy" content=(policy);
                meta name="viewport" content="width=device-width, initial-scale=1";
                meta name="color-scheme" content="light dark";
                meta name="generator" content={ (Tool::THIS.name) " " (Tool::THIS.version) };
                title { (escape(&page.title)) }
                style { (PreEscaped(STYLE)) }
            }
            body {
                a class="skip" href="#answer" { "To the verdict" }
                header {
                    p class="mark" aria-hidden="true" { span {} (Tool::THIS.name) span {} }
                    h1 { (escape(&page.title)) }
                    p class="asked" { (escape(&page.asked)) }
                }
                main {
                    section id="answer" class="answer" aria-label="Verdict" {
                        @for answer in &page.answers {
                            p {
                                @if !answer.name.is_empty() { b { (escape(&answer.name)) } ": " }
                                (escape(&answer.sentence))
                                @if !answer.figure.is_empty() { " " strong { (escape(&answer.figure)) } }
                            }
                        }
                    }
                    @if page.sections.len() > 2 {
                        nav aria-label="On this page" {
                            @for (index, part) in page.sections.iter().enumerate() {
                                a href={ "#part" (index) } { (escape(&part.heading)) }
                            }
                        }
                    }
                    @for part in &sections { (part) }
                }
                footer {
                    p { (page.caution) }
                    p { "Made by " (Tool::THIS.name) " " (Tool::THIS.version) "." }
                }
                script { (PreEscaped(SCRIPT)) }
            }
        }
    }
    .into_string()
}

fn section(part: &Section, index: usize, sets: &mut usize) -> Markup {
    html! {
        section id={ "part" (index) } {
            h2 { (escape(&part.heading)) }
            @for block in &part.blocks { (drawn(block, sets)) }
        }
    }
}

fn drawn(block: &Block, sets: &mut usize) -> Markup {
    match block {
        Block::Heading(text) => html! { h3 { (escape(text)) } },
        Block::Text(text) => html! { p { (escape(text)) } },
        Block::List(lines) => html! { ul { @for line in lines { li { (escape(line)) } } } },
        Block::Code(text) => html! { pre tabindex="0" { code { (text) } } },
        Block::Table(content) => table(content),
        Block::Figures(set) => {
            *sets += 1;
            figure_set(set, *sets)
        }
    }
}

fn table(content: &Table) -> Markup {
    html! {
        div class="scroll" tabindex="0" role="region" aria-label=(escape(&content.caption)) {
            // Two columns are names and facts, which may be long.
            table class=[(content.head.len() == 2).then_some("facts")] {
                caption { (escape(&content.caption)) }
                thead { tr { @for head in &content.head { th scope="col" { (escape(head)) } } } }
                tbody {
                    @for row in &content.rows {
                        tr {
                            @for (index, cell) in row.iter().enumerate() {
                                @if index == 0 { th scope="row" { (shown(cell)) } } @else { td { (shown(cell)) } }
                            }
                        }
                    }
                }
            }
        }
    }
}

/// A number is shown short and carried whole.
fn shown(cell: &Cell) -> Markup {
    match cell {
        Cell::Text(text) => html! { (escape(text)) },
        Cell::Number(Some(value), digits) => html! { data value=(value) { (figure(*value, *digits)) } },
        Cell::Number(None, _) => html! { "\u{2013}" },
    }
}
