using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>One page of the file.</summary>
/// <param name="Directory">Offset of its directory.</param>
/// <param name="Layout">What it shares with pages that are alike.</param>
/// <param name="OffsetsAt">Where the offsets of its segments stand.</param>
/// <param name="CountsAt">Where their byte counts stand; -1 where there are none.</param>
internal readonly record struct Page(long Directory, PageLayout Layout, long OffsetsAt, long CountsAt);

/// <summary>
/// The pages of a file, found in one walk over the chain of directories. Only offsets are kept: 32 bytes a page. The
/// walk ends on hostile chains too: no directory is visited twice, and directories and segment tables together may not
/// be longer than four times the file, nor may the image data of all pages.
/// </summary>
internal sealed class PageIndex
{
    private const int MostFrames = 1 << 23;
    private const string CopyAgain = "copy it again from its source";
    private readonly List<Page> pages = [];
    private readonly List<string> losses = [];
    private readonly Dictionary<PageLayout, PageLayout> layouts = [];
    private readonly TiffFile file;
    private readonly FileWindow window;
    private readonly SegmentTable table;
    private long budget;
    private long frames;

    private PageIndex(TiffFile file)
    {
        this.file = file;
        window = new FileWindow(file);
        table = new SegmentTable(file, window);
        budget = 4 * file.Length;
    }

    /// <summary>The pages, in the order of the chain.</summary>
    public IReadOnlyList<Page> Pages => pages;

    /// <summary>What is lost of a truncated file, a sentence for each run of pages; empty when it is whole.</summary>
    public IReadOnlyList<string> Losses => losses;

    /// <summary>The first page that is whole, which speaks for the file.</summary>
    public int FirstWhole => pages.FindIndex(p => !ReferenceEquals(p.Layout, PageLayout.Lost));

    /// <summary>Bytes of image data of all pages.</summary>
    public long ImageBytes { get; private set; }

    /// <summary>Bytes of image data of thumbnails.</summary>
    public long ThumbnailBytes { get; private set; }

    /// <summary>Tags of science pages that a result cannot carry: their type is unknown, or they point to directories below the page.</summary>
    public SortedSet<ushort> TagsNotCarried { get; } = [];

    /// <summary>Walks over the file.</summary>
    /// <param name="file">The file; where it allows that, pages that are not whole are passed over.</param>
    /// <exception cref="StackFormatException">Broken, hostile, truncated, or of a kind that is refused by name.</exception>
    public static PageIndex Walk(TiffFile file)
    {
        PageIndex index = new(file);
        index.WalkChain();
        return index;
    }

    private void WalkChain()
    {
        HashSet<long> seen = [];
        (int Page, string Why)? lost = null;
        StackFormatException? firstCut = null;
        long? offset = file.FirstDirectory;
        while (offset is > 0)
        {
            string where = string.Create(CultureInfo.InvariantCulture, $"{file.Path}, page {pages.Count}");
            if (!seen.Add(offset.Value))
                throw new StackFormatException($"{where}, byte {offset}", "the chain of pages leads back to a page before", "copy the file again from its source, or save it anew");
            try
            {
                TiffDirectory directory = TiffDirectory.Read(file, window, offset.Value, where);
                Spend(directory.ByteLength, where);
                pages.Add(PageOf(directory, offset.Value));
                TagsNotCarried.UnionWith(directory.Unknown);
                TagsNotCarried.UnionWith(directory.Fields.Select(f => f.Tag).Where(CarriedFields.PointsBelow));
                offset = directory.Next;
                if (lost is { } before)
                    losses.Add(Loss(before.Page, pages.Count - 2, before.Why));
                lost = null;
                losses.AddRange(directory.Lost.Select(field => $"of page {pages.Count - 1} {field}"));
            }
            catch (CutOffException cut)
            {
                string end = string.Create(CultureInfo.InvariantCulture, $"the file ends at byte {file.Length}");
                firstCut ??= new StackFormatException(string.Create(CultureInfo.InvariantCulture, $"{where}, byte {cut.Offset}"), $"{cut.Message} should be here, {end}", CopyAgain + ", or take its whole pages with --salvage", cut);
                if (!file.AllowTruncated)
                    throw firstCut;
                lost ??= (pages.Count, string.Create(CultureInfo.InvariantCulture, $"{cut.Message} should be at byte {cut.Offset}, {end}"));
                pages.Add(new Page(offset.Value, PageLayout.Lost, -1, -1));
                offset = cut.Next;
            }
        }

        if (pages.Count == 0)
            throw new StackFormatException($"{file.Path}, byte 4", "the file has no pages", CopyAgain);
        if (lost is { } last)
            losses.Add(Loss(last.Page, offset is null ? null : pages.Count - 1, last.Why));
        if (frames == 0 && firstCut is not null)
            throw firstCut;
    }

    /// <param name="first">First lost page.</param>
    /// <param name="last">Last one; null where nobody knows how many there were.</param>
    /// <param name="why">What is cut off of the first.</param>
    private static string Loss(int first, int? last, string why)
    {
        string which = last is null
            ? $"page {first} and all after it are lost"
            : last == first ? $"page {first} is lost" : $"pages {first} to {last} are lost";
        return $"{which}: {why}";
    }

    private Page PageOf(TiffDirectory directory, long offset)
    {
        PageLayout fresh = new PageRules(directory, window).Layout();
        if (!layouts.TryGetValue(fresh, out PageLayout? layout))
            layouts[fresh] = layout = fresh;
        bool tiled = directory.Find(Tag.TileOffsets) is not null;
        long offsetsAt = directory.Find(tiled ? Tag.TileOffsets : Tag.StripOffsets)?.ValueAt ?? -1;
        long countsAt = directory.Find(tiled ? Tag.TileByteCounts : Tag.StripByteCounts)?.ValueAt ?? -1;
        Page page = new(offset, layout, offsetsAt, countsAt);
        Spend((long)layout.Segments * (layout.OffsetType.Size() + layout.CountType.Size()), directory.Where);
        CheckSegments(page, directory.Where, directory.Next);
        frames += layout.Samples;
        if (frames > MostFrames)
            throw new StackFormatException(directory.Where, $"the stack has more than {MostFrames} frames", "split it");
        return page;
    }

    /// <summary>Every segment lies in the file and can hold what the page promises.</summary>
    private void CheckSegments(in Page page, string where, long next)
    {
        table.Load(page);
        PageLayout layout = page.Layout;
        long total = 0;
        for (int i = 0; i < layout.Segments; i++)
        {
            (long offset, long count) = table[i];
            if (!file.Holds(offset, count))
                throw new CutOffException(offset, string.Create(CultureInfo.InvariantCulture, $"its {layout.Grid.Word} {i} of {count} bytes"), next);
            total += count;
            if (layout.Frame is not null && count * layout.LargestRatio < layout.Grid.BytesOf(i))
                throw new StackFormatException(
                    string.Create(CultureInfo.InvariantCulture, $"{where}, {layout.Grid.Word} {i}, byte {offset}"),
                    string.Create(CultureInfo.InvariantCulture, $"{count} bytes cannot hold the {layout.Grid.BytesOf(i)} bytes of samples they stand for"),
                    CopyAgain);
        }

        // Pages that share image data are conceivable; a few bytes that stand for a mountain of frames are an attack.
        if (ImageBytes + total > 4 * file.Length)
            throw new StackFormatException(where, "the image data of the pages lie over each other", CopyAgain);
        if (total > file.Length || total > Array.MaxLength - (4L * layout.Segments))
            throw new StackFormatException(where, string.Create(CultureInfo.InvariantCulture, $"the page claims {total} bytes of image data"), CopyAgain);
        ImageBytes += total;
        if (layout.Frame is null)
            ThumbnailBytes += total;
    }

    private void Spend(long bytes, string where)
    {
        budget -= bytes;
        if (budget < 0)
            throw new StackFormatException(where, "the directories of the file lie over each other", CopyAgain);
    }
}
