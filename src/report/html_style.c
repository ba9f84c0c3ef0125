/* The head of the page and its look. The look is plain on purpose: black on white, one accent that
 * is said in words too, so that a copy from a poor printer reads like the original. */
#include "report/html_internal.h"

static const char style[] =
    "*{box-sizing:border-box}\n"
    "html{color-scheme:light;-webkit-text-size-adjust:100%}\n"
    "body{margin:0;background:#fff;color:#1b1b1b;"
    "font:16px/1.5 'Source Sans 3','Noto Sans','Liberation Sans',Arial,'DejaVu Sans',sans-serif}\n"
    "main{max-width:47rem;margin:0 auto;padding:1.5rem 1rem 3rem;overflow-wrap:break-word}\n"
    "h1{font-size:1.7rem;line-height:1.2;margin:.1rem 0 .2rem;string-set:report content()}\n"
    "h2{font-size:1.15rem;line-height:1.3;margin:2rem 0 .6rem;padding-bottom:.2rem;"
    "border-bottom:1px solid #c4c4c4}\n"
    "p,ul{margin:.5rem 0}ul{padding-left:1.3rem}li{margin:.25rem 0}\n"
    ".kind,.small,figcaption,caption{color:#4d4d4d;font-size:.88rem}\n"
    ".kind{margin:0}\n"
    ".verdict{border:2px solid;border-left-width:.7rem;padding:.2rem 1rem .7rem;margin:1rem 0}\n"
    ".verdict h2{border:0;margin:.5rem 0 .2rem;padding:0}\n"
    ".verdict .answer{font-size:1.15rem;line-height:1.4;margin:.2rem 0 .5rem}\n"
    ".identified{border-color:#00563e}.identified h2{color:#00563e}"
    ".narrowed{border-color:#7a4a00}.narrowed h2{color:#7a4a00}"
    ".absent{border-color:#5a2d82}.absent h2{color:#5a2d82}"
    ".unfit{border-color:#8c1d18}.unfit h2{color:#8c1d18}\n"
    ".facts{width:auto;margin:.4rem 0}.facts th,.facts td{border:0;padding:.08rem 1.4rem .08rem 0}"
    ".facts th{color:#4d4d4d}sub{line-height:0}\n"
    ".scroll{overflow-x:auto}\n"
    ".scroll:focus-visible{outline:2px solid #0059b3;outline-offset:2px}\n"
    "table{border-collapse:collapse;width:100%;margin:.7rem 0;font-size:.92rem;line-height:1.4}\n"
    "caption{text-align:left;padding:.2rem 0}\n"
    "th,td{text-align:left;vertical-align:top;padding:.25rem .8rem .25rem 0;"
    "border-bottom:1px solid #c4c4c4}\n"
    "thead th{border-bottom:1.5px solid #1b1b1b;vertical-align:bottom}\n"
    "tbody th{font-weight:400}\n"
    ".number,.code{font-variant-numeric:tabular-nums;white-space:nowrap;overflow-wrap:normal}\n"
    ".code{font-family:'Liberation Mono','DejaVu Sans Mono',monospace;font-size:.85rem;"
    "white-space:normal;overflow-wrap:anywhere}\n"
    "tr.first th,tr.first td{font-weight:600}tr.first .small{font-weight:400}\n"
    "tr.slip{background:#f0f0ec}\n"
    ".small{display:block}\n"
    "figure{margin:1rem 0 1.4rem}figure "
    "svg{display:block;width:100%;max-width:600px;min-width:540px;height:auto}\n"
    "figcaption{line-height:1.4;margin-top:.3rem}\n"
    ".sign p{display:inline-block;width:30%;margin:0 2.5% 0 0;padding-top:2.8rem}\n"
    ".sign span{display:block;border-top:1px solid #1b1b1b;padding-top:.2rem;"
    "font-size:.88rem;color:#4d4d4d}\n"
    "@media (max-width:40rem){body{font-size:15px}.scroll "
    "table{min-width:34rem}.verdict{padding:.2rem .7rem .6rem}"
    ".facts th,.facts td{padding-right:.7rem}.sign p{width:100%}}\n";

/* Lengths in points and millimetres hold on A4 and on US letter alike: only the page's size
 * differs, and without one the reader's printer decides. */
static const char print_style[] =
    "@page{%smargin:16mm 17mm 18mm;"
    "@bottom-left{content:string(report);font:8pt sans-serif;color:#4d4d4d}"
    "@bottom-right{content:'page ' counter(page) ' of ' counter(pages);"
    "font:8pt sans-serif;color:#4d4d4d}}\n"
    "@media print{body{font-size:10pt;line-height:1.4}main{max-width:none;padding:0}"
    "h1{font-size:17pt}h2{font-size:12pt;margin:14pt 0 4pt;break-after:avoid}"
    ".verdict .answer{font-size:12pt}table{font-size:9.2pt}"
    ".kind,.small,figcaption,caption,.sign span{font-size:9pt}.code{font-size:9pt}"
    ".scroll{overflow:visible}figure svg{min-width:0}"
    "tr,figure,.verdict,.sign,li{break-inside:avoid}thead{display:table-header-group}"
    "caption{break-after:avoid}p,li{orphans:2;widows:2}"
    ".points table{font-size:9pt}.points th,.points td{padding-top:1pt;padding-bottom:1pt}}\n";

void html_head(struct wa_text *page, const struct wa_result *result, enum wa_paper paper)
{
    static const char *const sizes[] = {"", "size:A4;", "size:letter;"};
    html_raw(page, "<!DOCTYPE html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\">\n"
                   "<meta http-equiv=\"Content-Security-Policy\" "
                   "content=\"default-src 'none'; style-src 'unsafe-inline'\">\n"
                   "<meta name=\"viewport\" content=\"width=device-width, initial-scale=1\">\n"
                   "<title>Identification by titration: ");
    html_text(page, html_sample_name(result));
    html_raw(page, "</title>\n<style>\n%s", style);
    html_raw(page, print_style, (size_t)paper < 3 ? sizes[paper] : "");
    html_raw(page, "</style>\n</head>\n");
}
