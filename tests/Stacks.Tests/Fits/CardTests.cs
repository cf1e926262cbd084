using Stacks.Formats.Fits;
using Xunit;

namespace Stacks.Tests.Fits;

/// <summary>Cards by the FITS Standard 4.0, sections 4.1 and 4.2, whose rules each case names.</summary>
public class CardTests
{
    private static FitsCard Card(string text) => new(text.PadRight(80));

    [Theory]
    [InlineData("NAXIS   =                    2 / axes", "NAXIS", "2", "axes")] // fixed format
    [InlineData("NAXIS   = 2", "NAXIS", "2", "")] // free format: anywhere in columns 11-80
    [InlineData("NAXIS   =                                        2/axes", "NAXIS", "2", "axes")] // no space about the slash
    [InlineData("SIMPLE  = T", "SIMPLE", "T", "")]
    [InlineData("BZERO   =           3.276800E4 /", "BZERO", "3.276800E4", "")]
    [InlineData("PIXVAL  = -1.5D-3 / D exponent", "PIXVAL", "-1.5D-3", "D exponent")]
    [InlineData("PLACE   = (1.0, -2.0) / complex", "PLACE", "(1.0, -2.0)", "complex")]
    [InlineData("UNDEF   =                      / undefined", "UNDEF", "", "undefined")]
    public void Numbers_and_logicals(string text, string keyword, string value, string comment)
    {
        FitsCard card = Card(text);
        Assert.True(card.HasValue);
        Assert.Equal((keyword, value, comment, false), (card.Keyword, card.Value, card.Comment, card.IsText));
    }

    [Theory]
    [InlineData("OBJECT  = 'M 13    '           / name", "M 13", "name")] // trailing spaces do not count
    [InlineData("OBJECT  = '  M 13'", "  M 13", "")] // leading ones do
    [InlineData("OBJECT  =      'M 13'", "M 13", "")] // free format
    [InlineData("OBSERVER= 'O''HARA'", "O'HARA", "")] // doubled quote
    [InlineData("PATH    = 'a/b' / slash in the string", "a/b", "slash in the string")]
    [InlineData("EMPTY   = ''", "", "")]
    [InlineData("QUOTE   = ''''", "'", "")]
    [InlineData("BROKEN  = 'no end", "no end", "")]
    public void Strings(string text, string value, string comment)
    {
        FitsCard card = Card(text);
        Assert.Equal((value, comment, true), (card.Value, card.Comment, card.IsText));
    }

    [Theory]
    [InlineData("COMMENT = 'this is a comment, not a value'")]
    [InlineData("HISTORY = 5")]
    [InlineData("        = 5")]
    [InlineData("NOVALUE  5")]
    [InlineData("TIGHT   =5")] // columns 9-10 must be an equals sign and a space
    public void Cards_without_a_value(string text) => Assert.False(Card(text).HasValue);

    [Fact]
    public void Hierarchical_keywords()
    {
        // From a real header (ESO's HIERARCH convention).
        FitsCard card = Card("HIERARCH ESO DET CHIP1 OUT1 RON=       3.00 / Readout noise per output (e-)");
        Assert.Equal(("HIERARCH ESO DET CHIP1 OUT1 RON", "3.00", "Readout noise per output (e-)"), (card.Keyword, card.Value, card.Comment));
        FitsCard text = Card("HIERARCH ESO DET NAME = 'Irene = I' / Name of detector system");
        Assert.Equal(("HIERARCH ESO DET NAME", "Irene = I"), (text.Keyword, text.Value));
    }

    [Fact]
    public void Written_cards_are_in_fixed_format()
    {
        // Section 4.2: logical in column 30, integers and reals end there, strings start in column 11.
        Assert.Equal("SIMPLE  =                    T / standard".PadRight(80), FitsCard.Logical("SIMPLE", true, "standard").Image);
        Assert.Equal("BITPIX  =                  -32".PadRight(80), FitsCard.Integer("BITPIX", -32, "").Image);
        Assert.Equal("BZERO   =  9223372036854775808".PadRight(80), FitsCard.Integer("BZERO", (Int128)1 << 63, "").Image);
        Assert.Equal("XTENSION= 'IMAGE   '           / image".PadRight(80), FitsCard.Text("XTENSION", "IMAGE", "image").Single().Image);
    }

    [Theory]
    [InlineData(0.1)]
    [InlineData(5)]
    [InlineData(-1e300)]
    [InlineData(1e20)]
    [InlineData(double.Epsilon)]
    [InlineData(0.045777764213996)]
    public void Real_numbers_keep_their_digits_and_have_a_point(double value)
    {
        FitsCard card = FitsCard.Number("VALUE", value, "");
        Assert.Contains('.', card.Value);
        Assert.Equal(value, double.Parse(card.Value, System.Globalization.CultureInfo.InvariantCulture));
    }

    [Fact]
    public void What_is_not_finite_is_undefined()
    {
        Assert.Equal("", FitsCard.Number("VALUE", double.NaN, "").Value);
        Assert.Equal("", FitsCard.Number("VALUE", double.NegativeInfinity, "").Value);
    }

    [Theory]
    [InlineData(8)]
    [InlineData(67)]
    [InlineData(68)]
    [InlineData(69)]
    [InlineData(70)]
    [InlineData(136)]
    [InlineData(500)]
    public void Long_strings_go_on_in_continue_cards(int length)
    {
        // Doubled quotes at every place a cut could fall.
        for (int quoteAt = 0; quoteAt < Math.Min(length, 140); quoteAt++)
        {
            string text = new string('x', quoteAt) + "'" + new string('y', length - quoteAt - 1);
            List<FitsCard> cards = FitsCard.Text("LONGTEXT", text, "").ToList();
            Assert.All(cards, card => Assert.Equal(80, card.Image.Length));
            Assert.All(cards.Skip(1), card => Assert.StartsWith("CONTINUE  '", card.Image, StringComparison.Ordinal));
            Assert.Equal(text, new FitsHeader("test", cards, 0).OwnText("LONGTEXT"));
        }
    }

    [Fact]
    public void Commentary_is_broken_at_spaces_and_stays_ascii()
    {
        string text = string.Join(' ', Enumerable.Range(0, 60).Select(i => "word" + i)) + " caf\u00e9";
        List<FitsCard> cards = FitsCard.Commentary("HISTORY", text).ToList();
        Assert.All(cards, card => Assert.Equal(80, card.Image.Length));
        Assert.All(cards, card => Assert.DoesNotContain(card.Image, c => c is < ' ' or > '~'));
        string joined = string.Join(' ', cards.Select(card => card.Image[8..].Trim()));
        Assert.Equal(text.Replace("\u00e9", "\\u00e9", StringComparison.Ordinal), joined);
        Assert.Equal(new string('z', 200), string.Concat(FitsCard.Commentary("COMMENT", new string('z', 200)).Select(card => card.Image[8..].Trim())));
    }
}
